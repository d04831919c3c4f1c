// SPDX-License-Identifier: GPL-3.0-or-later
// Real people's averages, positions and what their publishers or an independent analysis found in
// them. Read where present, skipped where not. Sources:
//   novel-sounds  Scharf, Widmann, Bonmassar & Wetzel 2022 Dev Cogn Neurosci 54:101072: means over
//   32
//                 adults, 24 of whom are here.
//   pictures      EEG Database, Begleiter, UCI, doi 10.24432/C5TS3D: an independent average over 16
//                 people, 12 of whom are here.
//                 The mean of n out of N people differs from that of all by sd sqrt(1/n - 1/N), sd
//                 the spread between people, which is taken from those here. Allowed: 3 of these
//                 and half of the last digit that the source gives.
//   caps          OpenNeuro ds004561, ds005403 (CC0).
#include "base_scratch.hpp"
#include "signal_support.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/error.hpp>
#include <headwater/signal/contrast.hpp>
#include <headwater/signal/reference.hpp>

#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

/// One condition of every person, uV.
std::vector<Average> everyone(const std::filesystem::path& folder, const std::string& condition,
                              const ChannelEdits& edits) {
  std::vector<Average> people;
  for (const auto& file : average_files(folder, condition)) {
    people.push_back(read_average(file, edits, VoltageUnit::microvolt));
    people.back().data_V *= 1e6;
  }
  return people;
}

/// First minus second condition, person by person.
std::vector<Average> minus(std::vector<Average> first, const std::vector<Average>& second) {
  EXPECT_EQ(first.size(), second.size());
  for (std::size_t i = 0; i < first.size(); ++i) {
    EXPECT_EQ(first[i].channels, second[i].channels);
    first[i].data_V -= second[i].data_V;
  }
  return first;
}

void refer_to_average(std::vector<Average>& people) {
  for (Average& one : people) one.data_V = average_reference(one.data_V.rows()) * one.data_V;
}

/// Mean of a channel over a window, both ends included, for each person.
Eigen::ArrayXd values_uV(const std::vector<Average>& people, const char* channel, double from_s,
                         double to_s) {
  Eigen::ArrayXd values(static_cast<Eigen::Index>(people.size()));
  for (std::size_t i = 0; i < people.size(); ++i) {
    const Average& one = people[i];
    const Eigen::Index row = find_label_any_case(one.channels, channel).value();
    const Eigen::ArrayXd inside =
        (one.times_s.array() > from_s - 1e-6 && one.times_s.array() < to_s + 1e-6).cast<double>();
    values[static_cast<Eigen::Index>(i)] =
        (one.data_V.row(row).transpose().array() * inside).sum() / inside.sum();
  }
  return values;
}

struct Expected {
  const char* channel;
  double from_s, to_s, uV;
};

/// `all`: people in the published mean.
void expect_values(const std::vector<Average>& people, int all,
                   const std::vector<Expected>& expected) {
  const auto here = static_cast<double>(people.size());
  for (const auto& [channel, from_s, to_s, uV] : expected) {
    const Eigen::ArrayXd values = values_uV(people, channel, from_s, to_s);
    const double spread = std::sqrt((values - values.mean()).square().sum() / (here - 1));
    const double allowed = 3 * spread * std::sqrt(1 / here - 1.0 / all) + 0.05;
    EXPECT_LT(allowed, 1.5) << channel;  // else the comparison would say little
    EXPECT_NEAR(values.mean(), uV, allowed)
        << channel << " from " << from_s << " to " << to_s << " s";
  }
}

TEST(SignalOpenData, NovelSoundsMeetThePublishedGroup) {
  NEED_OPEN_DATA(folder, "novel-sounds");
  const auto standard = everyone(folder, "standard", novel_sounds_edits());
  ASSERT_EQ(standard.size(), 24u);
  EXPECT_EQ(standard.front().channels.size(), 28u);
  expect_values(standard, 32,
                {{"Fz", 0.096, 0.098, -3.6},
                 {"FC1", 0.096, 0.098, -3.9},
                 {"Cz", 0.096, 0.098, -3.9},
                 {"M1", 0.096, 0.098, 0.8},
                 {"M2", 0.096, 0.098, 0.9}});
  expect_values(minus(everyone(folder, "novel", novel_sounds_edits()), standard), 32,
                {{"Cz", 0.11, 0.15, -1.7},
                 {"C4", 0.11, 0.15, -1.8},
                 {"T8", 0.11, 0.15, -1.9},
                 {"FC1", 0.11, 0.15, -1.2},
                 {"Cz", 0.25, 0.35, 5.5},
                 {"FC1", 0.25, 0.35, 5.5},
                 {"Pz", 0.25, 0.35, 3.0}});
}

TEST(SignalOpenData, PicturesMeetAnIndependentAverage) {
  NEED_OPEN_DATA(folder, "pictures-averages");
  auto object = everyone(folder, "object", pictures_edits());
  ASSERT_EQ(object.size(), 12u);
  EXPECT_EQ(object.front().channels.size(), 61u);
  refer_to_average(object);
  for (const char* channel : {"PO7", "PO8"}) {  // N1: -5 to -8 uV
    const double n1 = values_uV(object, channel, 0.164, 0.180).mean();
    EXPECT_LT(n1, -5 + 0.8) << channel;
    EXPECT_GT(n1, -8 - 0.8) << channel;
  }
  auto difference = minus(everyone(folder, "change", pictures_edits()),
                          everyone(folder, "repeat", pictures_edits()));
  refer_to_average(difference);
  expect_values(difference, 16,
                {{"Fz", 0.2, 0.28, -2.6},
                 {"FCz", 0.2, 0.28, -2.2},
                 {"PO7", 0.2, 0.28, 2.6},
                 {"P7", 0.2, 0.28, 2.8},
                 {"P8", 0.2, 0.28, 2.1},
                 {"CPz", 0.35, 0.45, -2.4},
                 {"C1", 0.35, 0.45, -2.1},
                 {"Pz", 0.35, 0.45, -2.0}});
}

/// Every person of a set: consistent, placeable, with a noise covariance and a contrast from it.
void expect_all_usable(const std::filesystem::path& folder, const Labels& conditions,
                       const ChannelEdits& edits, const NoiseOptions& options) {
  const TrialCounts counts(read_table(folder / "trials.tsv", "trial counts"));
  for (const auto& file : average_files(folder, conditions.front())) {
    const std::string name = file.filename().string();
    const std::string person = name.substr(0, name.find('_'));
    std::vector<Average> averages;
    for (const std::string& condition : conditions) {
      averages.push_back(read_average(folder / (person + "_" + condition + ".tsv"), edits,
                                      VoltageUnit::microvolt));
      averages.back().condition = condition;
      averages.back().trials = counts.trials(person, condition);
    }
    make_consistent(averages, conditions);
    const NoiseCovariance noise = estimate_noise(averages, options);
    const auto channels = static_cast<double>(averages[0].channels.size());
    // Background of single trials: a few uV to some tens, common practice. The residual has lost
    // its slow part with the straight lines.
    const double noise_uV = std::sqrt(noise.single_trial_V2.trace() / (channels - 1)) * 1e6;
    EXPECT_GT(noise_uV, 2) << person;
    EXPECT_LT(noise_uV, 40) << person;
    EXPECT_GT(noise.shrinkage, 0) << person;
    EXPECT_LT(noise.shrinkage, 1) << person;
    const ContrastWaveform contrast =
        form_contrast("c", {{conditions[0], 1}, {conditions[1], -1}}, averages, noise);
    EXPECT_NEAR(contrast.effective_trials, 1 / (1 / averages[0].trials + 1 / averages[1].trials),
                1e-9);
  }
}

TEST(SignalOpenData, EveryNovelSoundsPersonIsUsable) {
  NEED_OPEN_DATA(folder, "novel-sounds");
  expect_all_usable(folder, {"novel", "standard"}, novel_sounds_edits(), {});
}

TEST(SignalOpenData, EveryPicturesPersonIsUsable) {
  NEED_OPEN_DATA(folder, "pictures-averages");
  expect_all_usable(folder, {"change", "repeat", "object"}, pictures_edits(),
                    {NoiseOptions::From::residual, 0, 0, 0.6, {}, {}});
  // After the edits every channel has a place.
  const Average average = read_average(average_files(folder, "object").front(), pictures_edits(),
                                       VoltageUnit::microvolt);
  EXPECT_NO_THROW(standard_montage(average.channels, 0.092));
}

/// The table with every voltage multiplied: what a file in another unit looks like.
std::string scaled_table(const std::filesystem::path& file, double factor) {
  NumberTable table = read_number_table(file, "averages");
  table.values.rightCols(table.values.cols() - 1) *= factor;
  return number_table_text(table.columns, {}, table.values, 12);
}

void expect_units_told(const std::filesystem::path& folder, const Labels& conditions,
                       const ChannelEdits& edits) {
  const Scratch scratch;
  const auto path = scratch.folder / "scaled.tsv";
  for (const std::string& condition : conditions)
    for (const auto& file : average_files(folder, condition))
      for (const auto& [factor, unit] : {std::pair{1e-3, "mV"}, {1e-6, "V"}}) {
        write_file(path, scaled_table(file, factor));
        const std::string message =
            message_of<InputError>([&] { read_average(path, edits, VoltageUnit::microvolt); });
        EXPECT_NE(message.find("averages.unit = \"" + std::string(unit) + "\""), std::string::npos)
            << file.filename() << ": " << message;
      }
}

TEST(SignalOpenData, NovelSoundsInOtherUnitsAreRefused) {
  NEED_OPEN_DATA(folder, "novel-sounds");
  expect_units_told(folder, {"novel", "standard"}, novel_sounds_edits());
}

TEST(SignalOpenData, PicturesInOtherUnitsAreRefused) {
  NEED_OPEN_DATA(folder, "pictures-averages");
  expect_units_told(folder, {"object", "repeat", "change"}, pictures_edits());
}

// Source: notes on the recordings: radius 96 to 106 mm, rms 3 to 6 mm. All electrodes of a table
// enter here; one cap then has 6.506 mm, a little more than the notes' last digit allows.
TEST(SignalOpenData, DigitisedCapsAreHeads) {
  NEED_OPEN_DATA(folder, "caps");
  int caps = 0;
  for (const auto& entry : std::filesystem::directory_iterator(folder)) {
    if (!entry.path().filename().string().ends_with("electrodes.tsv")) continue;
    const SphereFit fit = fit_head_sphere(read_positions(entry.path(), PositionSpace::head));
    EXPECT_TRUE(fit.converged) << entry.path().filename();
    EXPECT_GT(fit.radius, 95.5e-3) << entry.path().filename();
    EXPECT_LT(fit.radius, 106.5e-3) << entry.path().filename();
    EXPECT_GT(fit.rms, 2.5e-3) << entry.path().filename();
    EXPECT_LT(fit.rms, 6.6e-3) << entry.path().filename();
    ++caps;
  }
  EXPECT_EQ(caps, 4);
}

// Source: electrodes.tsv of that set: a sphere of 85 mm, two digits after the point.
TEST(SignalOpenData, NovelSoundsPositionsAreASphere) {
  NEED_OPEN_DATA(folder, "novel-sounds");
  const Montage table = read_positions(folder / "electrodes.tsv", PositionSpace::head);
  EXPECT_EQ(table.labels.size(), 31u);
  const Eigen::ArrayXd radii = table.positions.colwise().norm().transpose().array();
  EXPECT_LT((radii - 85e-3).abs().maxCoeff(), 0.05e-3);
}

}  // namespace
}  // namespace headwater
