// SPDX-License-Identifier: GPL-3.0-or-later
// Limits that samples of a trial must keep: amplitude, flatness, step.
#pragma once
#include <headwater/signal/trials.hpp>

#include <Eigen/Core>

#include <string>
#include <vector>

namespace headwater {

/// Which leads (of #leads) break a limit in which trial, to judge the leads by: #trials by #leads,
/// empty without limits. Amplitude against the median over leads at each sample: one bad lead must
/// not mark them all, as it would in the average or as the reference. Flatness and step as
/// recorded; leads that are `restored` (the reference, zeros as recorded) have neither.
Eigen::Array<bool, Eigen::Dynamic, Eigen::Dynamic> mark_limits(const Eigen::MatrixXd& data_V,
                                                               Eigen::Index samples,
                                                               const std::vector<bool>& restored,
                                                               const TrialOptions& options);

/// The first limit that a trial breaks, by its worst lead. lead: -1, reason: "" - none.
struct BrokenLimit {
  std::string reason;  ///< "amplitude", "flat", "step"
  Eigen::Index lead = -1;
  double figure = 0;  ///< V
};

/// trial: #leads by #samples, as recorded; `leads`: those that count. Amplitude in their average
/// reference; flatness and step as recorded, not of `restored` leads.
BrokenLimit broken_limit(const Eigen::Ref<const Eigen::MatrixXd>& trial,
                         const std::vector<Eigen::Index>& leads, const std::vector<bool>& restored,
                         const TrialOptions& options);

}  // namespace headwater
