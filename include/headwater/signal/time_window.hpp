// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once
#include <headwater/base/labels.hpp>

#include <Eigen/Core>

#include <string>

namespace headwater {

/// A latency window, both ends included.
struct TimeWindow {
  std::string name;
  double from_s = 0, to_s = 0;
  Labels contrasts;  ///< contrasts it is meant for; empty: all
};

/// First sample and number of samples of a window (tolerance: 1e-6 s).
struct SampleRange {
  Eigen::Index first = 0, count = 0;
};

/// Throws InputError when no sample lies inside: says the window and the recorded range.
SampleRange samples_in(const Eigen::VectorXd& times_s, const TimeWindow& window);

}  // namespace headwater
