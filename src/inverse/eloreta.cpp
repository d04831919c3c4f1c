// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/units.hpp>
#include <headwater/inverse/eloreta.hpp>

#include <Eigen/Cholesky>
#include <Eigen/Eigenvalues>

#include <algorithm>
#include <cmath>

namespace headwater {
namespace {

/// B^(1/2) and B^(-1/2) of a symmetric positive definite block.
std::pair<Eigen::Matrix3d, Eigen::Matrix3d> roots(const Eigen::Matrix3d& block) {
  const Eigen::SelfAdjointEigenSolver<Eigen::Matrix3d> solver(block);
  const Eigen::Vector3d root = solver.eigenvalues().cwiseMax(0).cwiseSqrt();
  const Eigen::Matrix3d& v = solver.eigenvectors();
  return {v * root.asDiagonal() * v.transpose(),
          v * root.cwiseInverse().asDiagonal() * v.transpose()};
}

constexpr double kAdaptTolerance = 1e-2;

}  // namespace

Eloreta::Eloreta(const Subspace& subspace, const EloretaOptions& options)
    : options_(options),
      spectrum_(gram_spectrum(subspace.whitened_gain)),
      map_(subspace.whitener * subspace.basis.transpose()),
      gain_(subspace.whitened_gain),
      inverse_weight_(static_cast<std::size_t>(subspace.points())) {
  spectrum_.values *= static_cast<double>(gain_.cols()) / static_cast<double>(gain_.rows());
}

void Eloreta::weigh_gain() {
  weighted_.resize(gain_.rows(), gain_.cols());
  for (std::size_t l = 0; l < inverse_weight_.size(); ++l) {
    const auto column = static_cast<Eigen::Index>(3 * l);
    weighted_.middleCols<3>(column).noalias() = gain_.middleCols<3>(column) * inverse_weight_[l];
  }
}

void Eloreta::iterate(double alpha, double tolerance) {
  std::fill(inverse_weight_.begin(), inverse_weight_.end(), Eigen::Matrix3d::Identity());
  weigh_gain();
  converged_ = false;
  Eigen::MatrixXd gram(gain_.rows(), gain_.rows()), solved;  // solved = F^-1 W K, gram = F F'
  for (iterations_ = 0; iterations_ < options_.most_iterations && !converged_; ++iterations_) {
    gram.noalias() = weighted_ * gain_.transpose();
    gram.diagonal().array() += alpha;
    const Eigen::LLT<Eigen::MatrixXd> factor(gram);
    solved = gain_;
    factor.matrixL().solveInPlace(solved);
    double largest_change = 0;
    for (std::size_t l = 0; l < inverse_weight_.size(); ++l) {
      const auto block = solved.middleCols<3>(static_cast<Eigen::Index>(3 * l));
      const auto [weight, inverse] = roots(block.transpose() * block);
      // |W_new W_old^-1 - I|: the relative change without forming W_old.
      const double change =
          (weight * inverse_weight_[l] - Eigen::Matrix3d::Identity()).norm() / std::sqrt(3.0);
      largest_change = std::max(largest_change, change);
      inverse_weight_[l] = inverse;
    }
    converged_ = largest_change < tolerance;
    weigh_gain();
  }
}

void Eloreta::adapt(double lambda, double noise_scale) {
  iterate(lambda * noise_scale, kAdaptTolerance);
  // K W^-1 K' = X X' with X = K W^(-1/2).
  Eigen::MatrixXd root = gain_;
  for (std::size_t l = 0; l < inverse_weight_.size(); ++l)
    root.middleCols<3>(static_cast<Eigen::Index>(3 * l)) *= roots(inverse_weight_[l]).first;
  spectrum_ = gram_spectrum(root);
}

SourceOperator Eloreta::at(double lambda, double noise_scale) {
  const double alpha = lambda * noise_scale;
  iterate(alpha, options_.tolerance);
  Eigen::MatrixXd gram(gain_.rows(), gain_.rows());
  gram.noalias() = weighted_ * gain_.transpose();
  // The spectrum of the weights in use, so that a fit taken from it is that of this operator.
  const Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd> solver(gram);
  spectrum_ = {solver.eigenvalues().cwiseMax(0), solver.eigenvectors()};
  gram.diagonal().array() += alpha;
  const Eigen::LLT<Eigen::MatrixXd> factor(gram);
  SourceOperator result;
  result.method = "eloreta";
  result.quantity = "amplitude";
  result.unit = "nA m";
  result.unit_in_SI = kNanoampereMetre;
  result.lambda = lambda;
  result.map = map_;
  factor.matrixL().solveInPlace(result.map);
  result.precision.noalias() = result.map.transpose() * result.map;
  result.kernel = weighted_;
  factor.matrixL().solveInPlace(result.kernel);
  return result;
}

}  // namespace headwater
