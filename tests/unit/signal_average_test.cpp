// SPDX-License-Identifier: GPL-3.0-or-later
#include "base_scratch.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/error.hpp>
#include <headwater/signal/average.hpp>

#include <fmt/core.h>
#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

const Labels kEight{"Fz", "F3", "F4", "Cz", "C3", "C4", "Pz", "Oz"};

/// A table of eight channels; channel j at sample i holds scale * (i + 10 j).
std::string average_text(double rate_Hz, int decimals, double scale = 1, int samples = 40) {
  std::string text = "time_s";
  for (const std::string& name : kEight) text += "\t" + name;
  text += "\n";
  for (int i = 0; i < samples; ++i) {
    text += fmt::format("{:.{}f}", (i - 5) / rate_Hz, decimals);
    for (std::size_t j = 0; j < kEight.size(); ++j)
      text += fmt::format("\t{:.10g}", scale * (i + 10 * static_cast<double>(j)));
    text += "\n";
  }
  return text;
}

TEST(SignalAverage, ReadsVoltsInEveryUnit) {
  for (const VoltageUnit unit :
       {VoltageUnit::microvolt, VoltageUnit::millivolt, VoltageUnit::volt}) {
    const Scratch scratch;
    const auto path = scratch.folder / "a.tsv";
    write_file(path, average_text(500, 3, 1e-6 / volts_per(unit)));
    const Average average = read_average(path, {{"Oz"}, {{"Pz", "POz"}}, {"M1"}}, unit);
    EXPECT_EQ(average.channels, (Labels{"Fz", "F3", "F4", "Cz", "C3", "C4", "POz", "M1"}));
    ASSERT_EQ(average.data_V.rows(), 8);
    ASSERT_EQ(average.data_V.cols(), 40);
    EXPECT_NEAR(average.data_V(2, 7), 27e-6, 1e-15);
    EXPECT_NEAR(average.data_V(6, 0), 60e-6, 1e-15);
    EXPECT_EQ(average.data_V.row(7).cwiseAbs().maxCoeff(), 0);
    EXPECT_NEAR(average.times_s[5], 0, 1e-15);
    EXPECT_NEAR(average.times_s[39], 0.068, 1e-15);
  }
}

TEST(SignalAverage, AllowsForTheRoundingOfWrittenTimes) {
  for (const auto& [rate, decimals] :
       {std::pair{256.0, 3}, {256.0, 4}, {512.0, 4}, {160.0, 5}, {1000.0, 3}, {2048.0, 6}}) {
    const Scratch scratch;
    const auto path = scratch.folder / "a.tsv";
    write_file(path, average_text(rate, decimals, 1, 250));
    EXPECT_NO_THROW(read_average(path, {}, VoltageUnit::microvolt)) << rate << " " << decimals;
  }
}

TEST(SignalAverage, CountsTrialsByParticipantAndCondition) {
  const TrialCounts counts(
      parse_table("participant_id\tcondition\ttrials\nsub-01\ta\t31\nsub-01\tb\t0\nsub-"
                  "02\ta\t7\nsub-02\ta\t8\n",
                  "trials.tsv"));
  EXPECT_EQ(counts.trials("sub-01", "a"), 31);
  EXPECT_THROW(counts.trials("sub-01", "b"), InputError);
  EXPECT_THROW(counts.trials("sub-02", "a"), InputError);
  EXPECT_THROW(counts.trials("sub-03", "a"), InputError);
  EXPECT_EQ(TrialCounts(64).trials("anyone", "anything"), 64);
  EXPECT_THROW(TrialCounts(0.0).trials("anyone", "anything"), InputError);
}

Average small_average(const Labels& channels, double first, double trials) {
  Average average;
  average.condition = "a";
  average.channels = channels;
  average.times_s = Eigen::VectorXd::LinSpaced(3, 0, 0.008);
  average.data_V.resize(static_cast<Eigen::Index>(channels.size()), 3);
  for (Eigen::Index i = 0; i < average.data_V.rows(); ++i)
    average.data_V.row(i).setConstant(first + static_cast<double>(i));
  average.trials = trials;
  return average;
}

TEST(SignalAverage, BringsChannelsIntoTheOrderOfTheFirst) {
  std::vector<Average> averages{small_average({"A", "B", "C"}, 0, 1),
                                small_average({"c", "A", "B"}, 10, 1)};
  averages[1].times_s[1] += 2e-6;  // half a thousandth of a step
  make_consistent(averages, {"one.tsv", "two.tsv"});
  EXPECT_EQ(averages[1].channels, averages[0].channels);
  EXPECT_EQ(averages[1].times_s, averages[0].times_s);
  EXPECT_EQ(averages[1].data_V.col(0), Eigen::Vector3d(11, 12, 10));
}

TEST(SignalAverage, MeansOverParticipantsByName) {
  const Average mean =
      mean_average({small_average({"A", "B", "C"}, 0, 10), small_average({"D", "C", "A"}, 10, 20)});
  EXPECT_EQ(mean.channels, (Labels{"A", "C"}));
  EXPECT_EQ(mean.data_V.col(2), Eigen::Vector2d((0 + 12) / 2.0, (2 + 11) / 2.0));
  EXPECT_EQ(mean.trials, 30);
}

}  // namespace
}  // namespace headwater
