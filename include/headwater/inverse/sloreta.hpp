// SPDX-License-Identifier: GPL-3.0-or-later
// sLORETA (Pascual-Marqui 2002 Methods Find Exp Clin Pharmacol 24D:5):
//   T = K'(K K' + lambda C)^-1,  S = T K,  standardised moment S_ll^(-1/2) J_l, J = T y,
// so that its squared length is J_l' S_ll^-1 J_l. Zero peak error for one noise-free source at any
// point, orientation and lambda. Unit: A m (S is a resolution matrix, without unit): a current
// divided by the root of the point's own resolution, not the strength of a source.
#pragma once
#include <headwater/inverse/ridge.hpp>

namespace headwater {

class Sloreta {
 public:
  explicit Sloreta(const Subspace& subspace);
  const GramSpectrum& spectrum() const { return spectrum_; }
  SourceOperator at(double lambda, double noise_scale) const;

 private:
  GramSpectrum spectrum_;
  Eigen::MatrixXd map_;        // U'W B'
  Eigen::MatrixXd projected_;  // U'W K
};

/// S^(-1/2) of a symmetric positive definite 3 x 3 matrix (its null directions, below 1e-12 of the
/// largest eigenvalue, are left out).
Eigen::Matrix3d inverse_root(const Eigen::Matrix3d& matrix);

}  // namespace headwater
