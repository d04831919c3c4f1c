// SPDX-License-Identifier: GPL-3.0-or-later
// From events to epochs of samples: where they lie in a recording, and how they are read.
#pragma once
#include "signal/chosen_events.hpp"

#include <headwater/signal/trials.hpp>

#include <Eigen/Core>

#include <optional>
#include <string>
#include <vector>

namespace headwater {

/// The samples of an epoch, counted from the one nearest to the event.
struct EpochGrid {
  Eigen::Index first = 0, count = 0;                    ///< as recorded
  Eigen::Index decimate = 1;                            ///< kept: first, first + decimate, ...
  Eigen::Index baseline_first = 0, baseline_count = 0;  ///< counted from `first`; 0: no baseline
  Eigen::VectorXd times_s;                              ///< of the samples kept

  Eigen::Index kept() const { return times_s.size(); }
};

/// Checks the options against the recording (InputError, all problems at once).
EpochGrid make_grid(const Recording& recording, const TrialOptions& options);

/// Where each event's epoch starts, or why there is none.
struct PlacedEpoch {
  std::optional<Eigen::Index> sample;  ///< first sample of the epoch in the recording
  std::size_t segment = 0;
  double jitter_s = 0;  ///< event less its sample's time
  std::string reason;   ///< "outside the recording", "across a gap"
};

std::vector<PlacedEpoch> place_epochs(const Recording& recording, const EpochGrid& grid,
                                      const std::vector<ChosenEvent>& events);

/// Filters, cuts, takes drift and baseline off, decimates. channels: places in the recording; -1
/// gives zeros. Result: #channels by (#kept * #epochs), V. `placed`: those with a sample.
Eigen::MatrixXd read_epochs(const Recording& recording, const std::vector<Eigen::Index>& channels,
                            const EpochGrid& grid, const std::vector<PlacedEpoch>& placed,
                            const TrialOptions& options);

}  // namespace headwater
