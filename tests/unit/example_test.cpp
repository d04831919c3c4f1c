// SPDX-License-Identifier: GPL-3.0-or-later
// The invented example: its files are read with the tool's own readers, and what was planted is
// looked for in them with the standard head and cap, as a user would.
#include "app/example_noise.hpp"
#include "app/example_person.hpp"
#include "base_scratch.hpp"
#include "example_truth.hpp"

#include <headwater/app/example.hpp>
#include <headwater/base/atomic_file.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/json.hpp>
#include <headwater/base/table.hpp>
#include <headwater/base/toml.hpp>
#include <headwater/base/units.hpp>
#include <headwater/inverse/dipole_scan.hpp>
#include <headwater/model/lead_field.hpp>
#include <headwater/model/mni_map.hpp>
#include <headwater/model/regions.hpp>
#include <headwater/signal/contrast.hpp>
#include <headwater/signal/reference.hpp>
#include <headwater/signal/time_window.hpp>

#include <Eigen/QR>
#include <gtest/gtest.h>
#include <unistd.h>

#include <cmath>
#include <map>
#include <sstream>

namespace headwater {
namespace {

namespace fs = std::filesystem;

const Labels kConditions{"late_aided", "late_unaided", "steady_aided", "steady_unaided"};
const std::vector<Condition> kDesign{{"late_aided", {{"beat", "late"}, {"aid", "on"}}},
                                     {"late_unaided", {{"beat", "late"}, {"aid", "off"}}},
                                     {"steady_aided", {{"beat", "steady"}, {"aid", "on"}}},
                                     {"steady_unaided", {{"beat", "steady"}, {"aid", "off"}}}};
constexpr std::uint64_t kSeed = 1;

const std::vector<ConditionWeight> kSteady{{"steady_aided", 0.5}, {"steady_unaided", 0.5}};
std::vector<ConditionWeight> lateness_weights() {
  return effect_weights(kDesign, {{"beat", "late", "steady"}});
}
std::vector<ConditionWeight> aid_weights() {
  return effect_weights(kDesign, {{"aid", "on", "off"}});
}
std::vector<ConditionWeight> interaction_weights() {
  return effect_weights(kDesign, {{"beat", "late", "steady"}, {"aid", "on", "off"}});
}

/// The example as written once for all tests of this file, and read back.
class Example : public testing::Test {
 protected:
  static void SetUpTestSuite() {
    folder_ = fs::temp_directory_path() / ("headwater-example-" + std::to_string(::getpid()));
    fs::remove_all(folder_);
    write_example(folder_, kSeed);
    const TrialCounts counts(read_table(folder_ / "averages" / "trials.tsv", "trials"));
    for (const auto& row : participants().rows) {
      people_.push_back(row[0]);
      for (const auto& condition : kConditions) {
        auto average = read_average(folder_ / "averages" / (row[0] + "_" + condition + ".tsv"),
                                    ChannelEdits{{}, {}, {"FCz"}}, VoltageUnit::microvolt);
        average.condition = condition;
        average.trials = counts.trials(row[0], condition);
        averages_[row[0]].push_back(std::move(average));
      }
    }
  }
  static void TearDownTestSuite() { fs::remove_all(folder_); }

  static Table participants() { return read_table(folder_ / "participants.tsv", "participants"); }

  /// Mean over participants of a contrast.
  static ContrastWaveform group_mean(const std::vector<ConditionWeight>& weights) {
    std::vector<ContrastWaveform> contrasts;
    std::vector<NoiseCovariance> noises;
    for (const auto& person : people_) {
      const auto& averages = averages_.at(person);
      noises.push_back(
          estimate_noise(averages, {NoiseOptions::From::baseline, -0.1, 0, 0, {}, {}}));
      contrasts.push_back(form_contrast("contrast", weights, averages, noises.back()));
    }
    return mean_contrast(contrasts, noises);
  }
  static inline fs::path folder_;
  static inline Labels people_;
  static inline std::map<std::string, std::vector<Average>> averages_;
};

Eigen::VectorXd map_in(const ContrastWaveform& contrast, double from_s, double to_s) {
  const auto range = samples_in(contrast.times_s, {"window", from_s, to_s, {}});
  return contrast.data_V.middleCols(range.first, range.count).rowwise().mean();
}

double at_uV(const ContrastWaveform& contrast, const Eigen::VectorXd& map_V,
             std::string_view channel) {
  return map_V[*find_label(contrast.channels, channel)] / kMicrovolt;
}

/// Maps of the planted sources in the standard head and cap, average reference, V per A m.
Eigen::MatrixXd planted_maps(const Labels& channels, const std::vector<Planted>& sources) {
  const HeadModel head = default_head();
  const double radius = head.radii_m[head.radii_m.size() - 1];
  Eigen::MatrixXd maps(static_cast<Eigen::Index>(channels.size()),
                       static_cast<Eigen::Index>(sources.size()));
  for (Eigen::Index s = 0; s < maps.cols(); ++s) {
    const Planted& source = sources[static_cast<std::size_t>(s)];
    const Eigen::Vector3d point = mni_to_head(source.mni_m, radius);
    maps.col(s) =
        compute_gain(head, standard_montage(channels, radius).positions, point) * source.direction;
  }
  return average_reference(maps.rows()) * maps;
}

/// Least squares of a map on the planted sources' maps, and the standard errors from the noise of
/// one sample (the noise is slow: averaging over a window hardly lessens it).
struct Fit {
  Eigen::VectorXd moment_Am, error_Am;
  double explained = 0;
};

Fit fit_planted(const ContrastWaveform& contrast, const Eigen::VectorXd& map_V,
                const std::vector<Planted>& sources) {
  const Eigen::MatrixXd maps = planted_maps(contrast.channels, sources);
  const Eigen::MatrixXd inverse = maps.completeOrthogonalDecomposition().pseudoInverse();
  const Eigen::MatrixXd in_subspace = inverse * reference_free_basis(maps.rows());
  Fit fit;
  fit.moment_Am = inverse * map_V;
  fit.error_Am = (in_subspace * contrast.noise_V2 * in_subspace.transpose()).diagonal().cwiseSqrt();
  fit.explained = 1 - (map_V - maps * fit.moment_Am).squaredNorm() / map_V.squaredNorm();
  return fit;
}

std::map<std::string, std::string> bytes_of(const fs::path& folder) {
  std::map<std::string, std::string> files;
  for (const auto& entry : fs::recursive_directory_iterator(folder))
    if (entry.is_regular_file())
      files[fs::relative(entry.path(), folder).string()] = read_file(entry.path(), "file");
  return files;
}

TEST_F(Example, SameSeedGivesTheSameBytesAndAnotherSeedOtherPeople) {
  const Scratch scratch;
  const auto first = bytes_of(folder_);
  write_example(scratch.folder / "again", kSeed);
  EXPECT_TRUE(bytes_of(scratch.folder / "again") == first);
  write_example(scratch.folder / "other", kSeed + 1);
  const auto other = bytes_of(scratch.folder / "other");
  ASSERT_EQ(other.size(), first.size());
  for (const auto& [name, bytes] : first) {
    const std::string start = name.substr(0, name.find_first_of("/_."));
    const bool drawn =
        start == "averages" || name.find("truth_") == 0 || start == "participants" ||
        (start == "recordings" && (name.ends_with("_electrodes.tsv") ||
                                   name.ends_with("_events.tsv") || name.ends_with(".edf")));
    const auto kind = fs::path(name).extension();
    const bool differs = drawn && (kind == ".tsv" || kind == ".edf");
    EXPECT_EQ(other.at(name) != bytes, differs) << name;
  }
}

TEST_F(Example, FolderIsCompleteAndReadable) {
  ASSERT_EQ(people_.size(), 12u);
  EXPECT_EQ(people_.front(), "sub-01");
  EXPECT_EQ(people_.back(), "sub-12");
  std::uintmax_t bytes = 0;
  for (const auto& [name, content] : bytes_of(folder_)) {
    bytes += content.size();
    // BIDS lays down what stands beside a recording itself.
    const bool of_bids = name.ends_with("_eeg.json") || name.ends_with("_coordsystem.json") ||
                         name.ends_with("dataset_description.json");
    if (fs::path(name).extension() == ".json" && !of_bids) {
      EXPECT_TRUE(parse_json(content, name).find("Description")) << name;
    }
  }
  EXPECT_LT(bytes, 60'000'000u);
  for (const auto& person : people_)
    for (const auto& average : averages_[person]) {
      EXPECT_EQ(average.channels.size(), 64u);
      ASSERT_EQ(average.times_s.size(), 151);
      EXPECT_DOUBLE_EQ(average.times_s[0], -0.1);
      EXPECT_DOUBLE_EQ(average.times_s[150], 0.5);
      const bool late = average.condition.find("late_") == 0;
      EXPECT_GE(average.trials, late ? 60 : 250);
      EXPECT_LE(average.trials, late ? 90 : 300);
      // Baseline corrected, but for rounding to 1e-4 uV.
      const auto before = samples_in(average.times_s, {"baseline", -0.1, 0, {}});
      EXPECT_LT(average.data_V.leftCols(before.count).rowwise().mean().cwiseAbs().maxCoeff(),
                1e-4 * kMicrovolt);
    }
}

TEST_F(Example, ExperimentFileAgreesWithTheFiles) {
  const TomlValue file = read_toml(folder_ / "experiment.toml");
  Labels conditions, contrasts;
  for (const auto& table : std::get<TomlValue::Array>(file.find("conditions")->value))
    conditions.push_back(std::get<std::string>(table.find("name")->value));
  EXPECT_EQ(conditions, kConditions);
  for (const auto& table : std::get<TomlValue::Array>(file.find("contrasts")->value))
    contrasts.push_back(std::get<std::string>(table.find("name")->value));
  for (const auto& table : std::get<TomlValue::Array>(file.find("windows")->value))
    for (const auto& name : std::get<TomlValue::Array>(table.find("contrasts")->value))
      EXPECT_TRUE(find_label(contrasts, std::get<std::string>(name.value)));
  const Table truth = read_table(folder_ / "truth.tsv", "truth");
  for (const auto& row : truth.rows) {
    std::istringstream listed(row[truth.column("contrasts")]);
    for (std::string name; std::getline(listed >> std::ws, name, ',');)
      EXPECT_TRUE(find_label(contrasts, name)) << name;
  }
}

TEST_F(Example, RefusesAFolderInUse) {
  const Scratch scratch;
  write_file(scratch.folder / "mine.txt", "mine");
  const auto message = message_of<ExperimentError>([&] { write_example(scratch.folder, kSeed); });
  EXPECT_NE(message.find(scratch.folder.string() + " is not empty"), std::string::npos) << message;
  EXPECT_EQ(bytes_of(scratch.folder).size(), 1u);
  const auto of_file =
      message_of<ExperimentError>([&] { write_example(scratch.folder / "mine.txt", kSeed); });
  EXPECT_NE(of_file.find("is a file"), std::string::npos) << of_file;
  fs::create_directory(scratch.folder / "empty");
  write_example(scratch.folder / "empty", kSeed);
  EXPECT_TRUE(fs::exists(scratch.folder / "empty" / "experiment.toml"));
}

// Customary: N1 and mismatch are negative in front and at the top, and turn positive below the
// Sylvian fissure, of one to a few uV.
TEST_F(Example, ScalpMapsHaveTheRightSignAndSize) {
  const auto check = [](const ContrastWaveform& contrast, double from_s, double to_s) {
    const Eigen::VectorXd map = map_in(contrast, from_s, to_s);
    for (const char* name : {"FCz", "Fz"}) {
      EXPECT_LT(at_uV(contrast, map, name), -0.8) << name;
      EXPECT_GT(at_uV(contrast, map, name), -6) << name;
    }
    for (const char* name : {"TP9", "TP10", "P7", "P8"}) {
      EXPECT_GT(at_uV(contrast, map, name), 0.8) << name;
      EXPECT_LT(at_uV(contrast, map, name), 6) << name;
    }
  };
  check(group_mean(kSteady), 0.084, 0.116);
  check(group_mean(lateness_weights()), 0.140, 0.180);
}

// Each contrast shows what was planted for it, and only that, at the planted strength. Tolerance:
// three standard errors, of the noise and of people: strength 0.2 / sqrt(12) = 6 %, latency up to 8
// %, heads, skulls and electrodes that the standard head does not know, about 10 %: 15 % in all.
TEST_F(Example, ContrastsShowThePlantedStrengths) {
  const auto truth = read_truth(folder_ / "truth.tsv");
  ASSERT_EQ(truth.size(), 6u);
  const auto check = [&](const std::vector<ConditionWeight>& weights, double from_s, double to_s,
                         const Labels& names, double least_explained) {
    std::vector<Planted> sources;
    for (const auto& name : names) sources.push_back(truth.at(name));
    const ContrastWaveform contrast = group_mean(weights);
    const Fit fit = fit_planted(contrast, map_in(contrast, from_s, to_s), sources);
    EXPECT_GT(fit.explained, least_explained) << join_labels(names);
    for (std::size_t s = 0; s < names.size(); ++s) {
      const double expected_Am = sources[s].mean_strength(weights, from_s, to_s);
      const auto row = static_cast<Eigen::Index>(s);
      EXPECT_NEAR(fit.moment_Am[row], expected_Am,
                  3 * std::hypot(fit.error_Am[row], 0.15 * expected_Am))
          << names[s];
    }
  };
  const Labels n1{"N1 left", "N1 right"}, mismatch{"mismatch left", "mismatch right"},
      frontal{"mismatch left", "mismatch right", "right frontal"}, parietal{"left parietal"};
  check(kSteady, 0.092, 0.108, n1, 0.95);
  check(aid_weights(), 0.092, 0.108, n1, 0.5);
  check(lateness_weights(), 0.152, 0.176, mismatch, 0.9);
  check(lateness_weights(), 0.208, 0.236, frontal, 0.9);
  check(lateness_weights(), 0.284, 0.328, parietal, 0.8);
  check(aid_weights(), 0.284, 0.328, parietal, 0.6);
  check(interaction_weights(), 0.284, 0.328, parietal, 0.6);
  check(interaction_weights(), 0.092, 0.108, n1, 0);  // planted: nothing
}

TEST_F(Example, ScanFindsThePlantedPlaces) {
  const auto truth = read_truth(folder_ / "truth.tsv");
  const HeadModel head = default_head();
  const double radius = head.radii_m[head.radii_m.size() - 1];
  const SourceGrid grid = lattice_grid(7 * kMillimetre, radius);
  const ContrastWaveform steady = group_mean(kSteady), late = group_mean(lateness_weights());
  const auto electrodes = standard_montage(steady.channels, radius).positions;
  const Subspace subspace =
      make_subspace(steady.channels, compute_gain(head, electrodes, grid.head_m), steady.noise_V2);
  const DipoleScan scan(subspace, grid);

  // The scan's pairs are mirrored; the planted ones nearly so.
  const auto pair_is_at = [&](const ContrastWaveform& contrast, double from_s, double to_s,
                              const std::string& name) {
    const auto verdict = scan.judge(map_in(contrast, from_s, to_s));
    EXPECT_TRUE(verdict.pair_preferred) << name;
    for (const auto& [point, side] :
         {std::pair{verdict.pair.point, " right"}, std::pair{verdict.pair.partner, " left"}})
      EXPECT_LT((grid.mni_m.col(point) - truth.at(name + side).mni_m).norm(), 15 * kMillimetre)
          << name << side;
  };
  pair_is_at(steady, 0.092, 0.108, "N1");
  pair_is_at(late, 0.152, 0.176, "mismatch");

  const auto one_is_at = [&](double from_s, double to_s, const std::string& name) {
    const auto point = scan.judge(map_in(late, from_s, to_s)).one.point;
    EXPECT_LT((grid.mni_m.col(point) - truth.at(name).mni_m).norm(), 20 * kMillimetre) << name;
  };
  one_is_at(0.208, 0.236, "right frontal");
  one_is_at(0.284, 0.328, "left parietal");
}

TEST_F(Example, PlantedPlacesLieInTheNamedCortexAndOnNoLattice) {
  const std::map<std::string, std::string> lobes{
      {"N1 left", "temporal"},        {"N1 right", "temporal"},     {"mismatch left", "temporal"},
      {"mismatch right", "temporal"}, {"right frontal", "frontal"}, {"left parietal", "parietal"}};
  for (const auto& [name, source] : read_truth(folder_ / "truth.tsv")) {
    EXPECT_EQ(template_gyrus(source.mni_m).lobe, lobes.at(name)) << name;
    const bool left = name.find("left") != std::string::npos;
    EXPECT_EQ(source.mni_m.x() < 0, left) << name;
    for (int spacing = 4; spacing <= 12; ++spacing) {
      const double step = spacing * kMillimetre;
      const Eigen::Vector3d nearest = step * (source.mni_m.array() / step).round();
      EXPECT_GT((source.mni_m - nearest).norm(), 1 * kMillimetre) << name << " at " << spacing;
    }
  }
}

/// Mean over the epoch of the variance of x(t) - mean of x over the baseline, for a course of the
/// given rows: with R(t, s) = rows' rows, R(t, t) - 2 mean_s R(t, s) + mean R(s, s').
double power_after_baseline(const Eigen::MatrixXd& rows, Eigen::Index baseline_samples) {
  const Eigen::VectorXd mean = rows.leftCols(baseline_samples).rowwise().mean();
  return (rows.colwise() - mean).squaredNorm() / static_cast<double>(rows.cols());
}

// What is left when the sources' own response is taken away is the background of a trial over
// sqrt(n). Its power, relative to what the recipe asks for, spreads by 0.3 over averages (few
// frequencies and patches carry most of it), so by 0.3 / sqrt(48) = 0.045 in the mean over all.
TEST_F(Example, AveragesAreResponsePlusBackgroundOverRootTrials) {
  const ExampleRecipe recipe = read_example_recipe();
  const BackgroundSpectra spectra = background_spectra(recipe.background, recipe.times_s);
  const auto baseline = samples_in(recipe.times_s, {"baseline", -0.1, 0, {}}).count;
  const double share = recipe.background.alpha_share;
  const double patches = (1 - share) * power_after_baseline(spectra.broad, baseline) +
                         share * power_after_baseline(spectra.alpha, baseline);
  const double sensor = std::pow(recipe.background.sensor_V, 2);
  double relative = 0;
  for (std::size_t p = 0; p < people_.size(); ++p) {
    const ExamplePerson person = draw_person(recipe, kSeed, static_cast<int>(p) + 1);
    EXPECT_GE(person.background_rms_V, 10 * kMicrovolt);
    EXPECT_LE(person.background_rms_V, 15 * kMicrovolt);
    const double expected = patches * std::pow(person.background_rms_V, 2) + sensor;
    for (std::size_t k = 0; k < kConditions.size(); ++k) {
      const Average& average = averages_[people_[p]][k];
      ASSERT_EQ(average.channels, person.channels);
      EXPECT_EQ(average.trials, person.trials[k]);
      const Eigen::MatrixXd rest =
          average_reference(64) * (average.data_V - response_of(person, k, average.times_s));
      const double power = average.trials * rest.squaredNorm() / static_cast<double>(rest.size());
      EXPECT_GT(power / expected, 0.3) << person.name << " " << kConditions[k];
      EXPECT_LT(power / expected, 3) << person.name << " " << kConditions[k];
      relative += power / expected / 48;
    }
  }
  EXPECT_NEAR(relative, 1, 3 * 0.045);
}

}  // namespace
}  // namespace headwater
