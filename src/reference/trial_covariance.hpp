// SPDX-License-Identifier: GPL-3.0-or-later
// Plain twin of estimate_trial_noise() before shrinkage, for tests: the pooled covariance written
// out, entry by entry.
#pragma once
#include <headwater/signal/trials.hpp>

#include <Eigen/Core>

namespace headwater::reference {

/// Sum over conditions, trials and `count` samples from `first` on of residuals' products against
/// the average reference, M by M, divided by `degrees`.
Eigen::MatrixXd pooled_residuals(const Trials& trials, Eigen::Index first, Eigen::Index count,
                                 double degrees);

}  // namespace headwater::reference
