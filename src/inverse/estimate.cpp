// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/inverse/estimate.hpp>

#include <cmath>

namespace headwater {

SourceEstimate estimate_sources(const SourceOperator& inverse, const Eigen::MatrixXd& data_V) {
  SourceEstimate estimate;
  const Eigen::MatrixXd z = inverse.map * data_V;
  estimate.components.noalias() = inverse.kernel.transpose() * z;
  const Eigen::Index points = inverse.kernel.cols() / 3;
  estimate.amplitude.resize(points, data_V.cols());
  for (Eigen::Index t = 0; t < data_V.cols(); ++t) {
    const double* j = estimate.components.col(t).data();
    double* amplitude = estimate.amplitude.col(t).data();
    for (Eigen::Index p = 0; p < points; ++p, j += 3)
      amplitude[p] = std::sqrt(j[0] * j[0] + j[1] * j[1] + j[2] * j[2]);
  }
  return estimate;
}

Eigen::VectorXd window_map(const Eigen::MatrixXd& amplitude, const SampleRange& samples) {
  return amplitude.middleCols(samples.first, samples.count)
      .array()
      .square()
      .rowwise()
      .mean()
      .sqrt();
}

double resolution_trace(const SourceOperator& inverse, const Eigen::MatrixXd& gain) {
  return (inverse.kernel.array() * (inverse.map * gain).array()).sum();
}

}  // namespace headwater
