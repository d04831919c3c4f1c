// SPDX-License-Identifier: GPL-3.0-or-later
// eLORETA (Pascual-Marqui 2007 arXiv:0710.3341): source weights W_l (3 x 3) that make the
// localisation of any single source exact,
//   W_l <- [K_l'(K W^-1 K' + lambda C)^-1 K_l]^(1/2), all blocks at once from W = I until the
//   largest relative change of a block is below the tolerance; J_l = W_l^-1 K_l'(K W^-1 K' + lambda
//   C)^-1 y.
// W depends on lambda, and its scale is that of a resolution: about (M-1)/3N. So lambda is chosen
// from the gram matrix K W^-1 K' of weights that were adapted to a first guess. Unit: A m.
#pragma once
#include <headwater/inverse/ridge.hpp>

#include <vector>

namespace headwater {

struct EloretaOptions {
  double tolerance = 1e-6;
  int most_iterations = 200;
};

class Eloreta {
 public:
  explicit Eloreta(const Subspace& subspace, const EloretaOptions& options = {});
  /// Of K W^-1 K': W = (M-1)/3N I, then the weights of the last adapt() or at().
  const GramSpectrum& spectrum() const { return spectrum_; }
  /// Adapts the spectrum to lambda: weights iterated from I to a change below 1 %.
  void adapt(double lambda, double noise_scale);
  /// Iterates the weights from I.
  SourceOperator at(double lambda, double noise_scale);
  int iterations() const { return iterations_; }  ///< of the last call of at() or adapt()
  bool converged() const { return converged_; }

 private:
  void iterate(double alpha, double tolerance);
  void weigh_gain();

  EloretaOptions options_;
  GramSpectrum spectrum_;
  Eigen::MatrixXd map_;       // W B'
  Eigen::MatrixXd gain_;      // W K
  Eigen::MatrixXd weighted_;  // W K with each block times the inverse weight
  std::vector<Eigen::Matrix3d> inverse_weight_;
  int iterations_ = 0;
  bool converged_ = false;
};

}  // namespace headwater
