// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/units.hpp>
#include <headwater/inverse/sloreta.hpp>

#include <Eigen/Eigenvalues>

namespace headwater {

Eigen::Matrix3d inverse_root(const Eigen::Matrix3d& matrix) {
  const Eigen::SelfAdjointEigenSolver<Eigen::Matrix3d> solver(matrix);
  const double smallest = 1e-12 * solver.eigenvalues()[2];
  Eigen::Vector3d root = Eigen::Vector3d::Zero();
  for (int i = 0; i < 3; ++i)
    if (solver.eigenvalues()[i] > smallest) root[i] = 1 / std::sqrt(solver.eigenvalues()[i]);
  return solver.eigenvectors() * root.asDiagonal() * solver.eigenvectors().transpose();
}

Sloreta::Sloreta(const Subspace& subspace)
    : spectrum_(gram_spectrum(subspace.whitened_gain)), map_(spectrum_map(subspace, spectrum_)) {
  projected_.noalias() = spectrum_.vectors.transpose() * subspace.whitened_gain;
}

SourceOperator Sloreta::at(double lambda, double noise_scale) const {
  SourceOperator result;
  result.method = "sloreta";
  result.quantity = "standardised amplitude";
  result.unit = "nA m";
  result.unit_in_SI = kNanoampereMetre;
  result.lambda = lambda;
  result.map = map_;
  const Eigen::VectorXd shrink = (spectrum_.values.array() + lambda * noise_scale).inverse();
  result.precision.noalias() = map_.transpose() * shrink.asDiagonal() * map_;
  result.kernel.resize(projected_.rows(), projected_.cols());
  for (Eigen::Index column = 0; column < projected_.cols(); column += 3) {
    const auto block = projected_.middleCols<3>(column);
    const Eigen::Matrix<double, Eigen::Dynamic, 3> filter = shrink.asDiagonal() * block;
    const Eigen::Matrix3d resolution = block.transpose() * filter;
    result.kernel.middleCols<3>(column).noalias() = filter * inverse_root(resolution);
  }
  return result;
}

}  // namespace headwater
