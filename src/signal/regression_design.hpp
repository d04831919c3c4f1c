// SPDX-License-Identifier: GPL-3.0-or-later
// The design of a regression: which trials, which columns, and what they tell apart.
#pragma once
#include <headwater/signal/regression.hpp>

namespace headwater {

/// n trials used, K groups (conditions with such trials), R regressors.
struct Design {
  std::vector<Eigen::Index> trials;  ///< places in Trials
  std::vector<Eigen::Index> group;   ///< of each, 0 to K-1
  Eigen::VectorXd group_size;        ///< K
  Eigen::MatrixXd q;                 ///< n by R: orthonormal, orthogonal to the groups' indicators
  Eigen::MatrixXd inverse;           ///< R by R: (regressors, centred in groups and scaled) = q
                                     ///< inverse^-1, upper triangular
  Eigen::VectorXd mean, deviation, inflation;
  Labels notes;

  Eigen::Index count() const { return static_cast<Eigen::Index>(trials.size()); }
  Eigen::Index groups() const { return group_size.size(); }
  Eigen::Index regressors() const { return q.cols(); }
  /// [(X'X)^-1]_jj of each regressor.
  Eigen::VectorXd variance() const { return inverse.rowwise().squaredNorm(); }
};

/// Throws as regress().
Design make_design(const Trials& trials, const std::vector<Regressor>& regressors,
                   const RegressionOptions& options);

}  // namespace headwater
