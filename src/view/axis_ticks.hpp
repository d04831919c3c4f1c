// SPDX-License-Identifier: GPL-3.0-or-later
// Round numbers for the colour bars.
#pragma once
#include <string>
#include <vector>

namespace headwater {

/// A scale from zero upwards: ticks 0, step, 2 step ..., and the end of the bar.
struct TickScale {
  double step = 1;  ///< 1, 2 or 5 times a power of ten
  double top = 1;   ///< at least the largest value, a multiple of half a step
  std::vector<double> ticks() const;
  /// A tick's text with as many decimals as the step needs; large and small numbers as "4e+06".
  std::string text(double tick) const;
};

/// The scale for values from 0 to `largest` with about `intervals` ticks. `largest` 0 gives 0 to 1.
TickScale tick_scale(double largest, int intervals);

}  // namespace headwater
