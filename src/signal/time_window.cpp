// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/error.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/time_window.hpp>

#include <fmt/core.h>

namespace headwater {

SampleRange samples_in(const Eigen::VectorXd& times_s, const TimeWindow& window) {
  SampleRange range;
  for (Eigen::Index t = 0; t < times_s.size(); ++t) {
    if (times_s[t] < window.from_s - 1e-6 || times_s[t] > window.to_s + 1e-6) continue;
    if (range.count == 0) range.first = t;
    ++range.count;
  }
  if (range.count == 0)
    throw InputError(fmt::format(
        "Window '{}' ({:g} to {:g} ms) holds no sample: the averages run from {:g} to {:g} ms.",
        window.name, window.from_s / kMillisecond, window.to_s / kMillisecond,
        times_s.size() > 0 ? times_s[0] / kMillisecond : 0,
        times_s.size() > 0 ? times_s[times_s.size() - 1] / kMillisecond : 0));
  return range;
}

}  // namespace headwater
