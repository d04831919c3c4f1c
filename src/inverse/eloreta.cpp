// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/inverse/eloreta.hpp>

#include <Eigen/Cholesky>
#include <Eigen/Eigenvalues>
#include <algorithm>
#include <cmath>

#include <headwater/base/units.hpp>

namespace headwater {
namespace {

/// B^(1/2) and B^(-1/2) of a symmetric positive definite block.
std::pair<Eigen::Matrix3d, Eigen::Matrix3d> roots(const Eigen::Matrix3d& block) {
  const Eigen::SelfAdjointEigenSolver<Eigen::Matrix3d> solver(block);
  const Eigen::Vector3d root = solver.eigenvalues().cwiseMax(0).cwiseSqrt();
  const Eigen::Matrix3d& v = solver.eigenvectors();
  return {v * root.asDiagonal() * v.transpose(), v * root.cwiseInverse().asDiagonal() * v.transpose()};
}

}  // namespace

Eloreta::Eloreta(const Subspace& subspace, const EloretaOptions& options)
    : options_(options),
      spectrum_(gram_spectrum(subspace.whitened_gain)),
      map_(subspace.whitener * subspace.basis.transpose()),
      gain_(subspace.whitened_gain),
      inverse_weight_(static_cast<std::size_t>(subspace.points()), Eigen::Matrix3d::Identity()) {}

SourceOperator Eloreta::at(double lambda, double noise_scale) {
  const Eigen::Index dimension = gain_.rows();
  const double alpha = lambda * noise_scale;
  Eigen::MatrixXd weighted(dimension, gain_.cols());
  const auto factor_gram = [&] {
    for (std::size_t l = 0; l < inverse_weight_.size(); ++l) {
      const auto column = static_cast<Eigen::Index>(3 * l);
      weighted.middleCols<3>(column).noalias() =
          gain_.middleCols<3>(column) * inverse_weight_[l];
    }
    Eigen::MatrixXd gram(dimension, dimension);
    gram.noalias() = weighted * gain_.transpose();
    gram.diagonal().array() += alpha;
    return Eigen::LLT<Eigen::MatrixXd>(gram);
  };
  converged_ = false;
  Eigen::MatrixXd solved;  // F^-1 (WK), gram = F F'
  for (iterations_ = 0; iterations_ < options_.most_iterations && !converged_; ++iterations_) {
    const auto factor = factor_gram();
    solved = gain_;
    factor.matrixL().solveInPlace(solved);
    double largest_change = 0;
    for (std::size_t l = 0; l < inverse_weight_.size(); ++l) {
      const auto block = solved.middleCols<3>(static_cast<Eigen::Index>(3 * l));
      const auto [weight, inverse] = roots(block.transpose() * block);
      // |W_new - W_old| / |W_new|, written with inverses: both sides are near the fixed point.
      const double change = (weight * inverse_weight_[l] - Eigen::Matrix3d::Identity()).norm() /
                            std::sqrt(3.0);
      largest_change = std::max(largest_change, change);
      inverse_weight_[l] = inverse;
    }
    converged_ = largest_change < options_.tolerance;
  }
  const auto factor = factor_gram();
  SourceOperator result;
  result.method = "eloreta";
  result.quantity = "amplitude";
  result.unit = "nA m";
  result.unit_in_SI = kNanoampereMetre;
  result.lambda = lambda;
  result.map = map_;
  factor.matrixL().solveInPlace(result.map);
  result.kernel = weighted;
  factor.matrixL().solveInPlace(result.kernel);
  return result;
}

}  // namespace headwater
