// SPDX-License-Identifier: GPL-3.0-or-later
// Bad input of the signal wing: each case names what is wrong, where, and what to do.
#include "base_scratch.hpp"
#include "signal_support.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/table.hpp>
#include <headwater/signal/contrast.hpp>
#include <headwater/signal/electrodes.hpp>
#include <headwater/signal/noise_covariance.hpp>

#include <fmt/core.h>
#include <gtest/gtest.h>

namespace headwater {
namespace {

void expect_words(const std::string& message, const std::vector<std::string>& words) {
  for (const std::string& word : words)
    EXPECT_NE(message.find(word), std::string::npos) << "no '" << word << "' in: " << message;
}

template <typename Body>
void expect_input_error(Body&& body, const std::vector<std::string>& words) {
  expect_words(message_of<InputError>(body), words);
}

const Labels kNine{"Fz", "F3", "F4", "Cz", "C3", "C4", "Pz", "Oz", "O1"};

TEST(SignalFault, ChannelEditsListEveryProblem) {
  expect_input_error(
      [] {
        plan_channels(kNine, {{"F5x", "O1"}, {{"Q1", "Q2"}, {"O1", "O2"}, {"Fz", "F3"}}, {"Cz"}},
                      "a.tsv");
      },
      {"a.tsv: 5 problems", "'F5x' to drop", "'Q1' to rename", "'O1' is both dropped and renamed",
       "named F3", "'Cz' is to be a channel of zeros", "drop the file's column first"});
  expect_input_error(
      [] {
        plan_channels(kNine, {{"Fz", "O1"}, {}, {}}, "a.tsv");
      },
      {"7 channels left", "at least 8"});
  expect_input_error(
      [] {
        plan_channels({"A", "a", "B", "C", "D", "E", "F", "G"}, {}, "a.tsv");
      },
      {"more than one channel", "rename or drop"});
}

TEST(SignalFault, UnknownElectrodesAreListedWithSuggestions) {
  expect_input_error(
      [] {
        standard_montage({"Fz", "FCzz", "QQQQQQ", "Cz"}, 0.09);
      },
      {"2 problems", "'FCzz'", "FCz", "'QQQQQQ'", "drop", "table of positions"});
  expect_input_error(
      [] {
        select_positions(standard_montage({"Fz", "Cz"}, 0.09), {"M1", "Cz", "M2"}, "cap.tsv");
      },
      {"cap.tsv", "M1 and M2", "Fz and Cz"});
}

std::string cap_text(double per_metre, const std::string& header) {
  std::string text = header;
  const Montage cap = standard_montage(kNine, 0.09);
  for (std::size_t i = 0; i < kNine.size(); ++i) {
    const Eigen::Vector3d p = cap.positions.col(static_cast<Eigen::Index>(i)) * per_metre;
    text += fmt::format("\n{}\t{:.8g}\t{:.8g}\t{:.8g}", kNine[i], p.x(), p.y(), p.z());
  }
  return text + "\n";
}

TEST(SignalFault, PositionTables) {
  const Scratch scratch;
  const auto path = scratch.folder / "electrodes.tsv";
  const auto read = [&] { read_positions(path, PositionSpace::head); };
  const auto side = [&](const std::string& text) {
    write_file(scratch.folder / "coordsystem.json", text);
  };
  write_file(path, cap_text(1, "name\tx\ty\tz"));
  expect_input_error(read, {"electrodes.tsv", "not stated", "coordsystem.json", "x_mm"});
  side("{\"EEGCoordinateSystem\": \"Other\"}");
  expect_input_error(read, {"coordsystem.json", "no EEGCoordinateUnits"});
  side("{\"EEGCoordinateUnits\": \"n/a\"}");
  expect_input_error(read, {"\"n/a\"", "\"mm\", \"cm\" or \"m\""});
  side("{\"EEGCoordinateUnits\": \"mm\"}");
  expect_input_error(
      read, {"read in mm", "0.09 mm", "40 to 200 mm", "in m they would make a head of 90 mm"});
  write_file(path, cap_text(1e9, "name\tx_mm\ty_mm\tz_mm"));
  expect_input_error(read, {"no unit"});
  write_file(path, cap_text(1e3, "name\tx_mm\ty_mm\tz_mm") + "fz\t1\t2\t3\n");
  expect_input_error(read, {"more than one row", "upper and lower case"});
  write_file(path, "name\tx_mm\ty_mm\tz_mm\nA\t1\t2\t3\nB\tn/a\tn/a\tn/a\n");
  expect_input_error(read, {"1 positions", "at least 4"});
  write_file(path, "name\tx_mm\ty_mm\tz_mm\nA\t1\ttwo\t3\n");
  expect_input_error(read, {"line 2", "y_mm", "two"});
  write_file(path, "name\ttheta\tphi\nA\t1\t2\n");
  expect_input_error(read, {"x_mm", "theta"});
}

std::string average_text(const std::vector<double>& times, double scale) {
  std::string text = "time_s";
  for (const std::string& name : kNine) text += "\t" + name;
  for (std::size_t i = 0; i < times.size(); ++i) {
    text += fmt::format("\n{:.6g}", times[i]);
    for (std::size_t j = 0; j < kNine.size(); ++j)
      text += fmt::format("\t{:.6g}", scale * static_cast<double>((i * 7 + j * 3) % 11));
  }
  return text + "\n";
}

TEST(SignalFault, TablesOfAverages) {
  const Scratch scratch;
  const auto path = scratch.folder / "a.tsv";
  const auto read = [&] { read_average(path, {}, VoltageUnit::microvolt); };
  std::vector<double> good;
  for (int i = 0; i < 50; ++i) good.push_back(i * 4e-3);
  const auto changed = [&](auto&& change) {
    auto times = good;
    change(times);
    return average_text(times, 1);
  };
  write_file(path, average_text(good, 1));
  EXPECT_NO_THROW(read());
  write_file(path, "Fz\ttime_s\n1\t2\n");
  expect_input_error(read, {"a.tsv", "first column must be time_s", "Fz and time_s"});
  write_file(path, changed([](auto& t) { std::swap(t[3], t[4]); }));
  expect_input_error(read, {"do not increase", "row 5"});
  for (const std::ptrdiff_t missing : {1, 10, 25, 40, 48}) {
    write_file(path, changed([&](auto& t) { t.erase(t.begin() + missing); }));
    expect_input_error(read, {"not evenly spaced", "missing"});
  }
  write_file(path, changed([](auto& t) {
               for (double& v : t) v *= 1000;
             }));
  expect_input_error(read, {"look like ms", "1000"});
  write_file(path, average_text(good, 0));
  expect_input_error(read, {"every channel is flat"});
  for (const auto& [scale, unit] : {std::pair{1e-3, "mV"}, {1e-6, "V"}}) {
    write_file(path, average_text(good, scale));
    expect_input_error(
        read, {"read in uV", "0.1 to 1000 uV", fmt::format("averages.unit = \"{}\"", unit)});
  }
  write_file(path, average_text(good, 1));
  expect_input_error([&] { read_average(path, {}, VoltageUnit::volt); },
                     {"read in V", "averages.unit = \"uV\""});
  write_file(path, average_text(good, 1e9));
  expect_input_error(read, {"No unit"});
  for (const char* cell : {"nan", "n/a", "x", "inf"}) {
    std::string text = average_text(good, 1);
    text.replace(text.find("\n0.004\t") + 7, 1, cell);
    write_file(path, text);
    expect_input_error(read, {"line 3", "Fz", cell});
  }
}

TEST(SignalFault, TrialCountsListEveryRow) {
  expect_input_error(
      [] {
        TrialCounts(parse_table(
            "participant_id\tcondition\ttrials\na\tx\t-3\na\ty\t2.5\na\tz\tmany\n", "trials.tsv"));
      },
      {"3 problems", "line 2", "'-3'", "line 3", "'2.5'", "line 4", "'many'"});
  expect_input_error(
      [] { TrialCounts(parse_table("participant_id\ttrials\na\t3\n", "trials.tsv")); },
      {"condition"});
  const TrialCounts counts(
      parse_table("participant_id\tcondition\ttrials\na\tx\t0\n", "trials.tsv"));
  expect_input_error([&] { counts.trials("a", "x"); }, {"trials.tsv", "0 trials", "'a'", "'x'"});
  expect_input_error([&] { counts.trials("b", "x"); }, {"no row", "'b'"});
}

TEST(SignalFault, AveragesThatDiffer) {
  RandomStream random(1, "fault");
  auto averages =
      noise_averages(random, 1e-6 * Eigen::MatrixXd::Identity(8, 8), {1, 1, 1}, 20, -0.04);
  averages[1].channels[2] = "Q";
  averages[2].times_s.array() += 2e-3;
  expect_input_error(
      [&] {
        make_consistent(averages, {"one.tsv", "two.tsv", "three.tsv"});
      },
      {"2 problems", "one.tsv", "two.tsv lacks E3 and has in addition Q", "three.tsv",
       "20 samples from"});
  expect_input_error([&] { mean_average({averages[0], averages[2]}); }, {"participant 2 of 2"});
}

TEST(SignalFault, NoiseThatCannotBeEstimated) {
  RandomStream random(2, "fault");
  auto averages = noise_averages(random, 1e-6 * Eigen::MatrixXd::Identity(8, 8), {5, 5}, 20, 0.0);
  NoiseOptions options;
  expect_input_error([&] { estimate_noise(averages, options); }, {"no sample", "before 0 s", "5"});
  options.from = NoiseOptions::From::residual;
  options.after_s = 0.066;
  expect_input_error([&] { estimate_noise(averages, options); }, {"3 samples", "at least 5"});
  options.after_s = 0.03;
  options.shrinkage = 0;
  averages[0].data_V.bottomRows(3).setZero();
  averages[1].data_V.bottomRows(3).setZero();
  expect_input_error([&] { estimate_noise(averages, options); },
                     {"singular", "rank 5 of 7", "8 channels", "shrinkage"});
  averages[1].trials = 0;
  expect_input_error([&] { estimate_noise(averages, options); }, {"'condition1'", "0 trials"});
  averages[1].trials = 5;
  options.shrinkage = 1.5;
  EXPECT_THROW(estimate_noise(averages, options), ExperimentError);
}

TEST(SignalFault, NoiseTables) {
  const Scratch scratch;
  const auto path = scratch.folder / "noise.tsv";
  const Labels channels{"A", "B", "C"};
  const auto read = [&] { read_noise_table(path, channels, {}); };
  write_file(path, "name\tA\tB\tC\nA\t4\t1\t0\nB\t1\t4\t0\nC\t0\t0\t4\n");
  EXPECT_NO_THROW(read());
  write_file(path, "name\tA\tB\tD\nA\t4\t1\t0\nE\t1\t4\t0\nA\t0\t0\t4\n");
  expect_input_error(read, {"3 problems", "named A", "no row for B and C", "no column for C"});
  write_file(path, "name\tA\tB\tC\nA\t4\t1\t0\nB\t1.1\t4\t0\nC\t0\t0\t4\n");
  expect_input_error(read, {"not symmetric", "1.1", "row B, column A"});
  write_file(path, "name\tA\tB\tC\nA\t4\t5\t0\nB\t5\t4\t0\nC\t0\t0\t4\n");
  expect_input_error(read, {"not a covariance", "-1 uV^2"});
  write_file(path, "name\tA\tB\tC\nA\t4\t4\t0\nB\t4\t4\t0\nC\t0\t0\t4\n");
  expect_input_error(read, {"singular", "rank 1 of 2", "3 channels"});
  write_file(path, "name\tA\tB\tC\nA\t4\t1\tn/a\nB\t1\t4\t0\nC\t0\t0\t4\n");
  expect_input_error(read, {"line 2", "'C'"});
}

TEST(SignalFault, Effects) {
  const std::vector<Condition> conditions{{"a", {{"beat", "late"}, {"aid", "on"}}},
                                          {"b", {{"beat", "steady"}, {"aid", "on"}}},
                                          {"c", {{"beat", "late"}, {"aid", "off"}}}};
  expect_words(message_of<ExperimentError>([&] {
                 effect_weights(conditions, {{"bat", "late", "steady"}, {"aid", "on", "of"}});
               }),
               {"2 problems", "'bat'", "beat", "no level 'of'", "off"});
  expect_words(message_of<ExperimentError>([&] {
                 effect_weights(conditions, {{"beat", "late", "steady"}, {"aid", "on", "off"}});
               }),
               {"no condition has beat = steady, aid = off"});
  expect_words(message_of<ExperimentError>([&] {
                 effect_weights(conditions, {{"aid", "on", "on"}, {"aid", "on", "off"}});
               }),
               {"minus itself", "given twice"});
}

TEST(SignalFault, Contrasts) {
  RandomStream random(3, "fault");
  const auto averages =
      noise_averages(random, 1e-6 * Eigen::MatrixXd::Identity(8, 8), {5, 5}, 20, -0.04);
  const NoiseCovariance noise = estimate_noise(averages, {});
  expect_input_error(
      [&] {
        form_contrast("late", {{"x", 1}, {"condition0", -1}, {"y", 1}}, averages, noise);
      },
      {"Contrast 'late'", "2 problems", "'x'", "'y'"});
  EXPECT_THROW(form_contrast("none", {{"condition0", 0}}, averages, noise), ExperimentError);
}

}  // namespace
}  // namespace headwater
