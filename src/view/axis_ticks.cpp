// SPDX-License-Identifier: GPL-3.0-or-later
#include "view/axis_ticks.hpp"

#include <fmt/core.h>

#include <algorithm>
#include <cmath>

namespace headwater {

TickScale tick_scale(double largest, int intervals) {
  if (!(largest > 0)) return {0.5, 1};
  const double wanted = largest / intervals;
  const double power = std::pow(10, std::floor(std::log10(wanted)));
  double step = 10 * power;
  for (const double round : {5.0, 2.0, 1.0})
    if (wanted <= round * power * (1 + 1e-9)) step = round * power;
  // 1e-9: a largest value that is itself a half step must not gain another one by rounding.
  return {step, std::ceil(largest / (step / 2) * (1 - 1e-9)) * step / 2};
}

std::vector<double> TickScale::ticks() const {
  std::vector<double> result;
  for (int k = 0; k * step <= top * (1 + 1e-9); ++k) result.push_back(k * step);
  return result;
}

std::string TickScale::text(double tick) const {
  if (tick == 0) return "0";
  if (top >= 1e5 || top < 1e-3) return fmt::format("{:.2g}", tick);
  const int decimals = std::max(0, static_cast<int>(-std::floor(std::log10(step * (1 + 1e-9)))));
  return fmt::format("{:.{}f}", tick, decimals);
}

}  // namespace headwater
