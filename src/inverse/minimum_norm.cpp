// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/units.hpp>
#include <headwater/inverse/minimum_norm.hpp>

#include <cmath>

namespace headwater {

MinimumNorm::MinimumNorm(const Subspace& subspace, double depth_exponent) {
  const Eigen::Index points = subspace.points();
  weight_.resize(points);
  Eigen::MatrixXd weighted = subspace.whitened_gain;
  for (Eigen::Index l = 0; l < points; ++l) {
    const double norm = subspace.gain.middleCols<3>(3 * l).norm();
    weight_[l] = std::pow(norm, -2 * depth_exponent);
    weighted.middleCols<3>(3 * l) *= std::sqrt(weight_[l]);
  }
  spectrum_ = gram_spectrum(weighted);
  map_ = spectrum_map(subspace, spectrum_);
  projected_.noalias() = spectrum_.vectors.transpose() * weighted;  // R^(1/2) is inside already
  for (Eigen::Index l = 0; l < points; ++l)
    projected_.middleCols<3>(3 * l) *= std::sqrt(weight_[l]);
}

SourceOperator MinimumNorm::at(double lambda, double noise_scale) const {
  SourceOperator result;
  result.method = "minimum-norm";
  result.quantity = "amplitude";
  result.unit = "nA m";
  result.unit_in_SI = kNanoampereMetre;
  result.lambda = lambda;
  result.map = map_;
  const Eigen::ArrayXd shrink = 1 / (spectrum_.values.array() + lambda * noise_scale);
  result.kernel = shrink.matrix().asDiagonal() * projected_;
  result.precision.noalias() = map_.transpose() * shrink.matrix().asDiagonal() * map_;
  return result;
}

}  // namespace headwater
