// SPDX-License-Identifier: GPL-3.0-or-later
// Minimum norm with depth weighting (Hamalainen & Ilmoniemi 1994 Med Biol Eng Comput 32:35):
//   J = R K'(K R K' + lambda C)^-1 y,  R = blockdiag(r_l I_3),  r_l = ||K_l||_F^(-2p)
// so that a source's variance is weighted by norm^(-2p) and its amplitude by norm^(-p). K_l: the
// three columns of point l in V/(A m), reference-free, not whitened. J: A m. Depth exponents in
// print differ (Lin et al. 2006 NeuroImage 31:160): p is the user's choice, and printed.
#pragma once
#include <headwater/inverse/ridge.hpp>

namespace headwater {

class MinimumNorm {
 public:
  MinimumNorm(const Subspace& subspace, double depth_exponent);
  const GramSpectrum& spectrum() const { return spectrum_; }
  /// lambda: multiplier of the contrast's noise covariance (noise_scale times the subspace's).
  SourceOperator at(double lambda, double noise_scale) const;

 private:
  Eigen::VectorXd weight_;  // r_l
  GramSpectrum spectrum_;
  Eigen::MatrixXd map_;        // U'W B'
  Eigen::MatrixXd projected_;  // U'W K R
};

}  // namespace headwater
