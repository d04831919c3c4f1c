// SPDX-License-Identifier: GPL-3.0-or-later
// Invented single trials, built by hand.
#pragma once
#include "signal_support.hpp"

#include <headwater/signal/trials.hpp>

#include <utility>

namespace headwater {

/// Noise trials, V: at each sample factor * N(0, I), independent of the samples beside it. Times 4
/// ms apart from from_s on; conditions in turns until each has its number; event rows 3, 5, 7, ...
inline Trials noise_trials(RandomStream& random, const Eigen::MatrixXd& factor,
                           std::vector<int> numbers, Eigen::Index samples, double from_s) {
  Trials trials;
  trials.channels = numbered_channels(factor.rows());
  trials.times_s =
      Eigen::VectorXd::LinSpaced(samples, from_s, from_s + 4e-3 * static_cast<double>(samples - 1));
  for (std::size_t c = 0; c < numbers.size(); ++c)
    trials.conditions.push_back(fmt::format("condition{}", c));
  for (bool more = true; more;) {
    more = false;
    for (std::size_t c = 0; c < numbers.size(); ++c) {
      if (numbers[c]-- <= 0) continue;
      more = true;
      trials.event_row.push_back(3 + 2 * trials.condition.size());
      trials.condition.push_back(c);
    }
  }
  trials.data_V = factor * random.normal_matrix(factor.cols(), samples * trials.count());
  return trials;
}

/// One value for each event of noise_trials(), n/a between them.
inline Eigen::VectorXd of_events(const Trials& trials, const Eigen::VectorXd& of_trial) {
  Eigen::VectorXd values = Eigen::VectorXd::Constant(
      static_cast<Eigen::Index>(trials.event_row.back()) + 2, std::nan(""));
  for (std::size_t k = 0; k < trials.event_row.size(); ++k)
    values[static_cast<Eigen::Index>(trials.event_row[k])] = of_trial[static_cast<Eigen::Index>(k)];
  return values;
}

/// Keeps the trials of which the places are listed.
inline Trials pick_trials(const Trials& trials, const std::vector<Eigen::Index>& places) {
  Trials picked = trials;
  picked.condition.clear();
  picked.event_row.clear();
  const Eigen::Index samples = trials.times_s.size();
  picked.data_V.resize(trials.data_V.rows(), samples * static_cast<Eigen::Index>(places.size()));
  for (const Eigen::Index place : places) {
    picked.data_V.middleCols(picked.count() * samples, samples) = trials.trial(place);
    picked.condition.push_back(trials.condition[static_cast<std::size_t>(place)]);
    picked.event_row.push_back(trials.event_row[static_cast<std::size_t>(place)]);
  }
  return picked;
}

}  // namespace headwater
