// SPDX-License-Identifier: GPL-3.0-or-later
// Which events belong to which condition.
#pragma once
#include <headwater/signal/trials.hpp>

#include <cstddef>
#include <vector>

namespace headwater {

struct ChosenEvent {
  std::size_t row = 0;  ///< of the events table
  double onset_s = 0;
  std::size_t place = 0;  ///< of its condition among the choices
};

/// In order of onset. All problems at once (InputError): no events, unknown columns, conditions
/// without events, events of two conditions, onsets that are no number.
std::vector<ChosenEvent> choose_events(const Table& events, const std::vector<EventChoice>& choices,
                                       const std::string& recording);

}  // namespace headwater
