// SPDX-License-Identifier: GPL-3.0-or-later
// What must not change a result, and what must change it in one way only: the whole chain on a
// small experiment, run twice.
#include "outside_inverse.hpp"
#include "results_compare.hpp"
#include "small_experiment.hpp"

#include <gtest/gtest.h>

namespace headwater {
namespace {

namespace fs = std::filesystem;

const char* const kMethods = "methods = [\"minimum-norm\", \"sloreta\", \"eloreta\", \"lcmv\"]";
const char* const kFixed = "regularisation = { lambda = 3e18 }";
const char* const kStart = "sub-01/sub-01_contrast-lateMinusSteady";

std::string all_methods(const std::string& more = "") {
  return with(kSmallExperiment, "methods = [\"sloreta\"]", kMethods) + more;
}
std::string fixed_lambda(const std::string& more = "") {
  return with(kSmallExperiment, "regularisation = \"gcv\"", kFixed) + "[files]\ncourses = true\n" +
         more;
}

void expect_done(const ProgramRun& run) {
  ASSERT_EQ(run.exit_code, 0) << run.err;
  EXPECT_EQ(run.err, "");
}

/// Runs, changes, runs again: tables must agree but for rounding. GCV's minimum is searched to 1e-6
/// or so of lambda, hence the share.
template <typename Change>
void expect_unchanged(const Change& change, const Labels& skipped = {}) {
  SmallExperiment small;
  small.write("experiment.toml", all_methods());
  expect_done(small.run({"--output", "before"}));
  change(small);
  expect_done(small.run({"--output", "after"}));
  EXPECT_GT(expect_same_tables(small.folder / "before", small.folder / "after", 1e-6, skipped), 50);
}

TEST(CommandSmallChain, AnotherReferenceChangesNothing) {
  expect_unchanged([](SmallExperiment& small) {
    RandomStream random(3, "reference");
    small.change_numbers([&](NumberTable& table) {
      for (Eigen::Index t = 0; t < table.values.rows(); ++t)
        table.values.row(t).tail(table.values.cols() - 1).array() += 20 * random.normal();
    });
  });
}

TEST(CommandSmallChain, AnotherUnitChangesNothing) {
  expect_unchanged([](SmallExperiment& small) {
    small.change_numbers(
        [](NumberTable& table) { table.values.rightCols(table.values.cols() - 1) *= 1e-6; });
    small.write("experiment.toml", with(all_methods(), "counts =", "unit = \"V\"\ncounts ="));
  });
}

TEST(CommandSmallChain, AnotherOrderOfChannelsChangesNothing) {
  expect_unchanged(
      [](SmallExperiment& small) {
        small.change_averages([](const std::string& text) {
          return change_rows(text, [](int, std::vector<std::string>& cells) {
            std::reverse(cells.begin() + 1, cells.end());
            std::swap(cells[3], cells[17]);
          });
        });
      },
      // The first two list the channels; the intervals of the indices come from random draws, which
      // are made channel by channel.
      {"waveform", "electrodes", "indices"});
}

TEST(CommandSmallChain, AnotherOrderInOneConditionOnlyChangesNothing) {
  expect_unchanged([](SmallExperiment& small) {
    for (const auto& person : small.people) {
      const auto path = small.average(person, "steady");
      write_file(path, change_rows(read_file(path, "average"), [](int, auto& cells) {
                   std::reverse(cells.begin() + 1, cells.end());
                 }));
    }
  });
}

std::string mirrored_lead(std::string name) {
  if (name.back() >= '1' && name.back() <= '9') {
    const int number = name.back() - '0';
    name.back() = static_cast<char>('0' + (number % 2 == 1 ? number + 1 : number - 1));
  }
  return name;
}

TEST(CommandSmallChain, MirroredDataGiveMirroredSources) {
  SmallExperiment small;
  small.write("experiment.toml", fixed_lambda());
  expect_done(small.run({"--output", "before"}));
  small.change_averages([](const std::string& text) {
    return change_rows(text, [](int line, std::vector<std::string>& cells) {
      if (line > 1) return;
      for (std::size_t i = 1; i < cells.size(); ++i) cells[i] = mirrored_lead(cells[i]);
    });
  });
  expect_done(small.run({"--output", "after"}));
  const fs::path before = small.folder / "before", after = small.folder / "after";
  const Table grid = read_table(before / "grid.tsv", "grid");
  const std::string name = std::string(kStart) + "_method-sloreta_sourceCourses.tsv";
  const Numbers first = read_numbers(before / name), second = read_numbers(after / name);
  const double largest = first.values.cwiseAbs().maxCoeff();
  double worst = 0;
  for (std::size_t row = 0; row < grid.rows.size(); ++row) {
    const auto p = static_cast<Eigen::Index>(row);
    const auto image = static_cast<Eigen::Index>(grid.number(row, grid.column("mirror"))) - 1;
    for (const int axis : {0, 1, 2})
      worst = std::max(worst, (first.values.col(3 * p + axis) -
                               (axis == 0 ? -1 : 1) * second.values.col(3 * image + axis))
                                  .cwiseAbs()
                                  .maxCoeff());
  }
  EXPECT_LT(worst, 1e-9 * largest);
  const Table there = read_table(before / "summary.tsv", "summary");
  const Table here = read_table(after / "summary.tsv", "summary");
  ASSERT_EQ(there.rows.size(), here.rows.size());
  for (std::size_t row = 0; row < there.rows.size(); ++row) {
    Eigen::Vector3d place = place_mm(there, row);
    EXPECT_GT(place.x(), 0);
    place.x() = -place.x();
    EXPECT_EQ(place_mm(here, row), place);
    EXPECT_EQ(here.rows[row][here.column("side")], "left");
    EXPECT_EQ(here.rows[row][here.column("gyrus")], there.rows[row][there.column("gyrus")]);
  }
}

TEST(CommandSmallChain, CoursesFollowThePlainFormula) {
  for (const std::string method : {"minimum-norm", "sloreta"}) {
    SmallExperiment small;
    small.write("experiment.toml", fixed_lambda());
    expect_done(small.run({"--method", method}));
    const fs::path results = small.folder / "results";
    for (const std::string person : {"sub-01", "mean"}) {
      const Outside outside = read_outside(results, person, "lateMinusSteady", method);
      EXPECT_EQ(outside.lambda, 3e18);
      EXPECT_NEAR(outside.effective_trials, person == "mean" ? 150 : 50,
                  person == "mean" ? 15 : 1e-9);
      const Eigen::MatrixXd expected = outside_courses(outside, method);
      const Numbers courses = read_numbers(
          results / fmt::format("{0}/{0}_contrast-lateMinusSteady_method-{1}_sourceCourses.tsv",
                                person, file_label(method)));
      EXPECT_LT((courses.values - expected).cwiseAbs().maxCoeff(),
                1e-9 * expected.cwiseAbs().maxCoeff())
          << person << ", " << method;
    }
  }
}

TEST(CommandSmallChain, TheUsersPointsInTheHeadFrameAreTheLatticesTwins) {
  SmallExperiment small;
  small.write("experiment.toml", fixed_lambda());
  expect_done(small.run({"--output", "lattice"}));
  fs::copy_file(small.folder / "lattice" / "points.tsv", small.folder / "points.tsv");
  small.write("experiment.toml",
              with(fixed_lambda(), "spacing_mm = 12", "points = \"points.tsv\"\nspace = \"head\""));
  expect_done(small.run({"--output", "points"}));
  const std::string name = std::string(kStart) + "_method-sloreta_sourceCourses.tsv";
  const Numbers lattice = read_numbers(small.folder / "lattice" / name);
  const Numbers points = read_numbers(small.folder / "points" / name);
  EXPECT_EQ(lattice.columns, points.columns);
  EXPECT_LT((lattice.values - points.values).cwiseAbs().maxCoeff(),
            1e-9 * lattice.values.cwiseAbs().maxCoeff());
  const Table there = read_table(small.folder / "lattice" / "grid.tsv", "grid");
  const Table here = read_table(small.folder / "points" / "grid.tsv", "grid");
  ASSERT_EQ(there.rows.size(), here.rows.size());
  for (std::size_t row = 0; row < there.rows.size(); ++row)
    for (const char* column : {"x_mm", "y_mm", "z_mm", "side", "gyrus", "lobe", "mirror"})
      EXPECT_EQ(here.rows[row][here.column(column)], there.rows[row][there.column(column)]);
}

TEST(CommandSmallChain, TheUsersCovarianceTableTakesThePlaceOfTheDatas) {
  SmallExperiment small;
  small.write("experiment.toml", fixed_lambda());
  expect_done(small.run({"--output", "own", "--participant", "sub-01"}));
  const Outside outside =
      read_outside(small.folder / "own", "sub-01", "lateMinusSteady", "sloreta");
  // The table is of a single trial, the results' of the contrast.
  const Eigen::MatrixXd single = outside.noise_V2 * outside.effective_trials * 1e12;
  Labels columns{"name"};
  columns.insert(columns.end(), small.leads.begin(), small.leads.end());
  small.write("noise.tsv", number_table_text(columns, small.leads, single, 17));
  small.write("experiment.toml",
              fixed_lambda("[noise]\nfrom = \"table\"\ntable = \"noise.tsv\"\n"));
  expect_done(small.run({"--output", "given", "--participant", "sub-01"}));
  const std::string name = std::string(kStart) + "_method-sloreta_sourceCourses.tsv";
  const Numbers own = read_numbers(small.folder / "own" / name);
  const Numbers given = read_numbers(small.folder / "given" / name);
  EXPECT_LT((own.values - given.values).cwiseAbs().maxCoeff(),
            1e-9 * own.values.cwiseAbs().maxCoeff());
  // Four times the variance is not the same.
  small.write("noise.tsv", number_table_text(columns, small.leads, 4 * single, 17));
  expect_done(small.run({"--output", "other", "--participant", "sub-01"}));
  EXPECT_GT((own.values - read_numbers(small.folder / "other" / name).values).norm(),
            0.01 * own.values.norm());
}

TEST(CommandSmallChain, TheSeriesIsAVolumeForEachSampleWithAnIndex) {
  SmallExperiment small;
  small.write("experiment.toml", std::string(kSmallExperiment) + "[files]\nseries = true\n");
  expect_done(small.run({"--participant", "sub-01"}));
  const fs::path results = small.folder / "results";
  expect_whole_files(results);
  const std::string start = (results / kStart).string() + "_method-sloreta_sources_series";
  const std::string index = read_file(start + ".pvd", "index");
  int steps = 0;
  for (const auto& entry : fs::directory_iterator(start)) {
    EXPECT_EQ(entry.path().extension(), ".vti");
    EXPECT_TRUE(holds(index, entry.path().filename().string()));
    ++steps;
  }
  EXPECT_EQ(steps, SmallExperiment::kSamples);
  EXPECT_TRUE(fs::exists(start + ".nii.gz"));
}

}  // namespace
}  // namespace headwater
