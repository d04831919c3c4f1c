// SPDX-License-Identifier: GPL-3.0-or-later
// The invented example from end to end, held against what was planted in it. The group mean of 12
// people is located with the standard head and cap, though each person had another head, skull and
// cap: see templates/example.toml.
#include "base_scratch.hpp"
#include "example_truth.hpp"
#include "outside_inverse.hpp"
#include "program.hpp"

#include <headwater/model/mni_map.hpp>

#include <gtest/gtest.h>

#include <cstdlib>

namespace headwater {
namespace {

namespace fs = std::filesystem;

/// The example with a lattice of 10 mm, and what else is to be changed in its experiment file.
void write_example_in(const fs::path& folder, const std::string& methods,
                      const std::string& more = "") {
  const ProgramRun run = run_program({"example", "example", "--quiet"}, folder);
  ASSERT_EQ(run.exit_code, 0) << run.err;
  EXPECT_EQ(run.out, "");
  const fs::path file = folder / "example" / "experiment.toml";
  std::string text = with(read_file(file, "experiment"), "spacing_mm = 7", "spacing_mm = 10");
  text = with(text, R"(["minimum-norm", "sloreta", "lcmv"])", methods);
  write_file(file, text + more);
}

/// How large the estimate of a lone dipole at the planted place is at each point, as a share of its
/// largest: the method's own point spread, by the plain formula.
Eigen::VectorXd point_spread(const Outside& outside, const Planted& source) {
  Eigen::Matrix3Xd place(3, 1);
  place.col(0) = mni_to_head(source.mni_m, 92 * kMillimetre);
  const Eigen::MatrixXd field =
      compute_gain(default_head(), outside.electrodes_m, place) * source.direction;
  const Eigen::MatrixXd inverse =
      reference::sloreta(outside.subspace_gain(), outside.subspace_noise(), outside.lambda);
  const Eigen::VectorXd j = inverse * (outside.basis.transpose() * field);
  const Eigen::VectorXd amplitude = j.reshaped(3, j.size() / 3).colwise().norm().transpose();
  return amplitude / amplitude.maxCoeff();
}

struct Expectation {
  const char *source, *contrast, *label, *window, *region;
  bool pair;
};
const Expectation kExpectations[] = {
    {"N1 left", "steady beats", "steadyBeats", "N1", "temporal left", true},
    {"N1 right", "steady beats", "steadyBeats", "N1", "temporal right", true},
    {"mismatch left", "late minus steady", "lateMinusSteady", "mismatch", "temporal left", true},
    {"mismatch right", "late minus steady", "lateMinusSteady", "mismatch", "temporal right", true},
    {"right frontal", "late minus steady", "lateMinusSteady", "late frontal", "frontal right",
     false},
    {"left parietal", "lateness by aid", "latenessByAid", "late parietal", "parietal left", false},
    {"left parietal", "late minus steady", "lateMinusSteady", "late parietal", "parietal left",
     false}};

/// The row of the kind that lies nearest to a place.
std::size_t nearest_row(const Table& table, const std::string& window, const std::string& kind,
                        const Eigen::Vector3d& mm) {
  const auto rows = rows_with(table, {{"window", window}, {"kind", kind}});
  EXPECT_FALSE(rows.empty()) << window << ", " << kind;
  return rows.empty() ? 0 : *std::min_element(rows.begin(), rows.end(), [&](auto a, auto b) {
    return (place_mm(table, a) - mm).norm() < (place_mm(table, b) - mm).norm();
  });
}

/// A planted source must be a maximum of the map where its own point spread is above half power
/// (amplitude 1/sqrt 2): a place that the method cannot tell from the true one with data of this
/// noise. And within 2 cm, since the half-power region is a blob of that radius.
void expect_found(const fs::path& results, const Planted& source, const Expectation& expected) {
  SCOPED_TRACE(fmt::format("{} in {}", expected.source, expected.contrast));
  const Outside outside = read_outside(results, "mean", expected.label, "sloreta");
  const Eigen::VectorXd spread = point_spread(outside, source);
  const Table peaks = read_table(
      results / fmt::format("mean/mean_contrast-{}_method-sloreta_peaks.tsv", expected.label),
      "peaks");
  const Eigen::Vector3d truth = source.mni_m / kMillimetre;
  const std::size_t row = nearest_row(peaks, expected.window, "peak", truth);
  const Eigen::Vector3d found = place_mm(peaks, row);
  const Eigen::Vector3d head = mni_to_head(found * kMillimetre, 92 * kMillimetre);
  Eigen::Index point = 0;
  EXPECT_LT((outside.head_m.colwise() - head).colwise().norm().minCoeff(&point), 1e-4);
  EXPECT_GT(spread[point], std::sqrt(0.5));
  EXPECT_LT((found - truth).norm(), 20);
  EXPECT_FALSE(holds(peaks.rows[row][peaks.column("note")], "false"));
  EXPECT_EQ(peaks.rows[row][peaks.column("side")], truth.x() < 0 ? "left" : "right");
  if (!expected.pair) {
    EXPECT_EQ(peaks.rows[row][peaks.column("rank")], "1");
  } else {
    const std::size_t half = nearest_row(peaks, expected.window, "mirrored pair", truth);
    EXPECT_LT((place_mm(peaks, half) - truth).norm(), 15);
  }
}

void expect_regions(const fs::path& results, const Expectation& expected) {
  SCOPED_TRACE(fmt::format("{} in {}", expected.source, expected.contrast));
  const Table regions = read_table(
      results / fmt::format("mean/mean_contrast-{}_method-sloreta_regions.tsv", expected.label),
      "regions");
  for (const auto row :
       rows_with(regions, {{"window", expected.window}, {"region", expected.region}})) {
    EXPECT_LE(regions.number(row, regions.column("rank")), expected.pair ? 2 : 1);
    EXPECT_EQ(regions.rows[row][regions.column("deep")], "no");
  }
  const Table summary = read_table(results / "summary.tsv", "summary");
  const auto rows = rows_with(summary, {{"participant_id", "mean"},
                                        {"contrast", expected.contrast},
                                        {"window", expected.window},
                                        {"method", "sloreta"},
                                        {"kind", "peak"}});
  ASSERT_EQ(rows.size(), 1u);
  const auto& strongest = summary.rows[rows[0]][summary.column("strongest_regions")];
  EXPECT_LT(strongest.find(expected.region), expected.pair ? 40u : 1u) << strongest;
}

/// The voxel of the largest value, by an outside reader, is the first peak of the table.
void expect_volume_agrees(const fs::path& results) {
  const std::string python = "/usr/bin/python3";
  if (std::system((python + " -c 'import nibabel' 2>/dev/null").c_str()) != 0) {
    GTEST_LOG_(WARNING) << "python3-nibabel is missing: volumes were not read from outside";
    return;
  }
  const fs::path start = results / "mean" / "mean_contrast-lateMinusSteady_method-sloreta";
  const Table peaks = read_table(start.string() + "_peaks.tsv", "peaks");
  for (const auto& [window, label] : {std::pair{"mismatch", "mismatch"},
                                      {"late frontal", "lateFrontal"},
                                      {"late parietal", "lateParietal"}}) {
    const std::string script = fmt::format(
        "import nibabel, numpy\n"
        "v = nibabel.load('{}_window-{}_sources.nii.gz')\n"
        "d = v.get_fdata()\n"
        "at = numpy.unravel_index(numpy.argmax(d), d.shape)\n"
        "print(*nibabel.affines.apply_affine(v.affine, at), d[at], sep='\\t')\n",
        start.string(), label);
    write_file(results / "script.py", script);
    const std::string printed = (results / "printed").string();
    ASSERT_EQ(
        std::system(fmt::format("{} '{}' > '{}'", python, (results / "script.py").string(), printed)
                        .c_str()),
        0);
    const Table place = parse_table("x\ty\tz\tvalue\n" + read_file(printed, "place"), "nibabel");
    const auto rows = rows_with(peaks, {{"window", window}, {"kind", "peak"}, {"rank", "1"}});
    ASSERT_EQ(rows.size(), 1u);
    const Eigen::Vector3d found(place.number(0, 0), place.number(0, 1), place.number(0, 2));
    EXPECT_LT((found - place_mm(peaks, rows[0])).norm(), 1e-3) << window;
    const double value = peaks.number(rows[0], peaks.column("value"));
    EXPECT_NEAR(place.number(0, 3), value, 1e-5 * value);  // six digits, and float32
  }
  fs::remove(results / "script.py");
  fs::remove(results / "printed");
}

TEST(CommandExampleChain, FindsWhatWasPlanted) {
  const Scratch scratch;
  const fs::path folder = scratch.folder / "in";
  fs::create_directories(folder);
  write_example_in(folder, R"(["sloreta", "minimum-norm"])", "\n[files]\ncourses = true\n");
  const ProgramRun run =
      run_program({"run", "example/experiment.toml", "--participant", "mean"}, folder);
  ASSERT_EQ(run.exit_code, 0) << run.err;
  expect_said(run.out, {"12 of 12 participants read", "late minus steady, mismatch (mean)",
                        "mirrored pair", "summary.tsv"});
  const fs::path results = folder / "example" / "results";
  expect_whole_files(results);
  const auto planted = read_truth(folder / "example" / "truth.tsv");
  for (const auto& expected : kExpectations) {
    expect_found(results, planted.at(expected.source), expected);
    expect_regions(results, expected);
  }
  expect_volume_agrees(results);
  for (const char* method : {"sloreta", "minimum-norm"}) {
    const Outside outside = read_outside(results, "mean", "steadyBeats", method);
    const Numbers courses = read_numbers(
        results / fmt::format("mean/mean_contrast-steadyBeats_method-{}_sourceCourses.tsv",
                              file_label(method)));
    const Eigen::MatrixXd expected = outside_courses(outside, method);
    EXPECT_LT((courses.values - expected).cwiseAbs().maxCoeff(),
              1e-9 * expected.cwiseAbs().maxCoeff())
        << method;
  }
}

TEST(CommandExampleChain, ResultsDoNotDependOnTheNumberOfJobs) {
  const Scratch scratch;
  const fs::path folder = scratch.folder / "in";
  fs::create_directories(folder);
  write_example_in(folder, R"(["minimum-norm", "sloreta", "eloreta", "lcmv"])");
  const fs::path file = folder / "example" / "experiment.toml";
  write_file(file, with(read_file(file, "experiment"), "table = \"participants.tsv\"",
                        "table = \"participants.tsv\"\nleave_out = [\"sub-04\", \"sub-05\", "
                        "\"sub-06\", \"sub-07\", \"sub-08\", \"sub-09\", \"sub-10\", \"sub-11\", "
                        "\"sub-12\"]"));
  for (const char* jobs : {"1", "2"}) {
    const ProgramRun run =
        run_program({"run", "example/experiment.toml", "--quiet", "--jobs", jobs, "--contrast",
                     "late minus steady", "--output", std::string("jobs") + jobs},
                    folder);
    ASSERT_EQ(run.exit_code, 0) << run.err;
    EXPECT_EQ(run.out + run.err, "");
  }
  const auto one = files_below(folder / "jobs1"), two = files_below(folder / "jobs2");
  EXPECT_GT(one.size(), 100u);
  ASSERT_EQ(one.size(), two.size());
  for (const auto& [name, bytes] : one) EXPECT_TRUE(two.at(name) == bytes) << name;
}

}  // namespace
}  // namespace headwater
