// SPDX-License-Identifier: GPL-3.0-or-later
// Moved fists of one person, where the open recordings are present: reading, events and filters
// together against a fact found independently of this program (the folder's README): the power from
// 8 to 13 Hz drops against rest, by 43 % at C4 and 28 % at C3 for the left fist, by 38 % at C3 and
// 28 % at C4 for the right. The README does not say window nor reference, hence 15 points of
// tolerance; and the side opposite to the fist must drop more, which is the textbook fact
// (Pfurtscheller & Lopes da Silva 1999 Clin Neurophysiol 110:1842).
#include "signal_support.hpp"

#include <headwater/signal/recording.hpp>
#include <headwater/signal/zero_phase_filter.hpp>

#include <gtest/gtest.h>

#include <map>

namespace headwater {
namespace {

/// Mean 8 to 13 Hz power of a lead over the events of each type, average reference, V^2.
std::map<std::string, double> band_power(const Recording& recording, const std::string& lead) {
  const auto& segment = recording.segments().at(0);
  Eigen::VectorXd mean = Eigen::VectorXd::Zero(segment.count), own = mean, each = mean;
  double leads = 0;
  for (std::size_t k = 0; k < recording.channels().size(); ++k) {
    if (!recording.channels()[k].set_aside.empty()) continue;
    recording.read(k, segment.first, segment.count, each.data());
    mean += each;
    ++leads;
    if (recording.channels()[k].name == lead) own = each;
  }
  own -= mean / leads;
  std::vector<double> course(own.begin(), own.end());
  const double rate = recording.sampling_Hz();
  ZeroPhaseFilter(ZeroPhaseFilter::Kind::high_pass, 8, 8, rate).apply(course);
  ZeroPhaseFilter(ZeroPhaseFilter::Kind::low_pass, 13, 8, rate).apply(course);
  const Table& events = recording.events();
  std::map<std::string, double> power, samples;
  for (std::size_t row = 0; row < events.rows.size(); ++row) {
    const auto& type = events.rows[row][events.column("trial_type")];
    const auto first = static_cast<std::size_t>(events.number(row, events.column("onset")) * rate);
    const auto count =
        static_cast<std::size_t>(events.number(row, events.column("duration")) * rate);
    for (std::size_t t = first; t < std::min(first + count, course.size()); ++t) {
      power[type] += course[t] * course[t];
      ++samples[type];
    }
  }
  for (auto& [type, value] : power) value /= samples[type];
  return power;
}

TEST(SignalFists, RhythmOverTheHandAreaDropsOnTheOtherSide) {
  NEED_OPEN_DATA(folder, "fists");
  const Recording recording(folder / "S001R03.edf");
  auto c3 = band_power(recording, "C3"), c4 = band_power(recording, "C4");
  const auto drop = [](std::map<std::string, double>& power, const std::string& fist) {
    return 100 * (1 - power.at(fist) / power.at("T0"));
  };
  EXPECT_NEAR(drop(c4, "T1"), 43, 15);
  EXPECT_NEAR(drop(c3, "T1"), 28, 15);
  EXPECT_NEAR(drop(c3, "T2"), 38, 15);
  EXPECT_NEAR(drop(c4, "T2"), 28, 15);
  EXPECT_GT(drop(c4, "T1"), drop(c3, "T1"));
  EXPECT_GT(drop(c3, "T2"), drop(c4, "T2"));
}

}  // namespace
}  // namespace headwater
