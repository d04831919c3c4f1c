// SPDX-License-Identifier: GPL-3.0-or-later
// Single trials from end to end: the invented recordings, held against what was planted in them,
// and an experiment file begun from their folder.
#include "base_scratch.hpp"
#include "example_truth.hpp"
#include "program.hpp"
#include "results_compare.hpp"

#include <headwater/base/json.hpp>

#include <gtest/gtest.h>

#include <cmath>
#include <map>

namespace headwater {
namespace {

namespace fs = std::filesystem;

/// The example with a lattice of 10 mm for its recordings.
class CommandRecordings : public ::testing::Test {
 protected:
  void SetUp() override {
    fs::create_directories(scratch_.folder / "in");
    const ProgramRun run = run_program({"example", "example", "--quiet"}, scratch_.folder / "in");
    ASSERT_EQ(run.exit_code, 0) << run.err;
    const fs::path file = folder() / "recordings.toml";
    write_file(file, with(read_file(file, "experiment"), "spacing_mm = 7", "spacing_mm = 10"));
  }
  fs::path folder() const { return scratch_.folder / "in" / "example"; }
  ProgramRun run(const std::vector<std::string>& arguments) const {
    return run_program(arguments, folder());
  }

 private:
  Scratch scratch_;
};

double number_at(const Table& table, const std::string& column,
                 const std::map<std::string, std::string>& where) {
  const auto rows = rows_with(table, {where.begin(), where.end()});
  EXPECT_EQ(rows.size(), 1u) << column;
  return rows.empty() ? std::nan("") : table.number(rows[0], table.column(column));
}

TEST_F(CommandRecordings, TheSurpriseEffectIsFoundWhereItWasPlanted) {
  const ProgramRun done = run({"run", "recordings.toml"});
  ASSERT_EQ(done.exit_code, 0) << done.err;
  const fs::path results = folder() / "results_recordings";
  expect_whole_files(results);
  const Table truth = read_table(folder() / "truth_recordings.tsv", "truth");
  const Table places = read_table(folder() / "truth.tsv", "truth");
  // What the observer of the program felt is what was planted.
  for (std::size_t row = 0; row < truth.rows.size(); ++row) {
    const auto& who = truth.rows[row][0];
    const Table regression = read_table(results / who / (who + "_regression.tsv"), "regression");
    EXPECT_NEAR(number_at(regression, "mean", {{"predictor", "surprise"}}),
                truth.number(row, truth.column("surprise_mean")), 6e-4);
    EXPECT_NEAR(number_at(regression, "deviation", {{"predictor", "surprise"}}),
                truth.number(row, truth.column("surprise_sd")), 6e-4);
    EXPECT_GE(number_at(regression, "inflation", {{"predictor", "surprise"}}), 1 - 1e-9);
  }
  // The mean of the four: both mismatch sources, the right one the stronger.
  const Table summary = read_table(results / "summary.tsv", "summary");
  const auto peaks = rows_with(summary, {{"participant_id", "mean"},
                                         {"contrast", "surprise"},
                                         {"method", "sloreta"},
                                         {"kind", "peak"}});
  ASSERT_EQ(peaks.size(), 1u);
  EXPECT_EQ(summary.rows[peaks[0]][summary.column("side")], "right");
  for (const auto row : rows_with(places, {{"name", "mismatch right"}}))
    EXPECT_LT((place_mm(summary, peaks[0]) - place_mm(places, row)).norm(), 20);
  EXPECT_NEAR(summary.number(peaks[0], summary.column("latency_ms")), 165, 12);
  EXPECT_TRUE(summary.rows[peaks[0]][summary.column("strongest_regions")].starts_with("temporal "));
}

TEST_F(CommandRecordings, TheBadLeadAndEveryDecisionIsListed) {
  const ProgramRun done = run({"inspect", "recordings.toml"});
  ASSERT_EQ(done.exit_code, 0) << done.err;
  expect_said(done.out, {"FT9", "31-239"});
  for (const char* who : {"sub-01", "sub-03"})
    ASSERT_EQ(run({"locate", "recordings.toml", "--participant", who, "--method", "sloreta",
                   "--output", "decisions", "--quiet"})
                  .exit_code,
              0);
  const Table leads = read_table(folder() / "decisions/sub-03/sub-03_leads.tsv", "leads");
  EXPECT_EQ(leads.rows.size(), 64u);
  const auto bad = rows_with(leads, {{"bad", "yes"}});
  ASSERT_EQ(bad.size(), 1u);
  EXPECT_EQ(leads.rows[bad[0]][0], "FT9");
  EXPECT_TRUE(holds(leads.rows[bad[0]][leads.column("reason")], "spline error"));
  const Table electrodes = read_table(folder() / "decisions/electrodes.tsv", "electrodes");
  EXPECT_EQ(electrodes.rows.size(), 63u);  // left out of the lead field as well
  const Table trials = read_table(folder() / "decisions/sub-03/sub-03_trials.tsv", "trials");
  const Table events =
      read_table(folder() / "recordings/sub-03/eeg/sub-03_task-pattern_events.tsv", "events");
  EXPECT_EQ(trials.rows.size(), events.rows.size());
  // The predictor stands beside each trial: its mean is that of the regression.
  const Table regression =
      read_table(folder() / "decisions/sub-03/sub-03_regression.tsv", "regression");
  double sum = 0, kept = 0;
  for (std::size_t row = 0; row < trials.rows.size(); ++row) {
    if (trials.rows[row][trials.column("kept")] != "yes") continue;
    sum += trials.number(row, trials.column("surprise"));
    ++kept;
  }
  EXPECT_NEAR(sum / kept, number_at(regression, "mean", {{"predictor", "surprise"}}), 1e-5);
  const Table good = read_table(folder() / "decisions/sub-01/sub-01_leads.tsv", "leads");
  EXPECT_TRUE(rows_with(good, {{"bad", "yes"}}).empty());
}

// The noise that the sources' maps are judged by is that of the windows: the planted background,
// the sensors' 2 uV, and what subtracting a baseline of 100 ms adds - not that of the baseline
// itself, which is a fifth smaller.
TEST_F(CommandRecordings, TheNoiseIsThatOfTheWindows) {
  const ProgramRun done = run({"inspect", "recordings.toml", "--json"});
  ASSERT_EQ(done.exit_code, 0) << done.err;
  const Table truth = read_table(folder() / "truth_heads.tsv", "truth");
  const Json json = parse_json(done.out, "inspect");
  for (const auto& person : json.find("participants")->items()) {
    const std::string who = person.find("participant_id")->text();
    const double planted =
        std::hypot(number_at(truth, "background_uV", {{"participant_id", who}}), 2);
    const double found = std::stod(person.find("noise_uV")->text());
    EXPECT_GT(found, planted) << who;
    EXPECT_LT(found, std::sqrt(2) * planted) << who;
  }
}

TEST_F(CommandRecordings, LeadsCanBeFixedByHand) {
  const fs::path file = folder() / "fixed.toml";
  write_file(file, with(read_file(folder() / "recordings.toml", "experiment"), "[leads]",
                        "[leads]\nbad = { sub-01 = [\"Pz\"] }\ngood = { sub-03 = [\"FT9\"] }"));
  const ProgramRun done = run({"inspect", "fixed.toml", "--json"});
  ASSERT_EQ(done.exit_code, 0) << done.err;
  const Json json = parse_json(done.out, "inspect");
  const auto& people = json.find("participants")->items();
  EXPECT_EQ(people[0].find("bad_leads")->text(), "Pz");
  EXPECT_EQ(people[2].find("bad_leads")->text(), "none");
  EXPECT_EQ(people[0].find("channels")->text(), "63");
  EXPECT_EQ(people[2].find("channels")->text(), "64");
}

TEST_F(CommandRecordings, ResultsDoNotDependOnTheNumberOfJobs) {
  for (const char* jobs : {"1", "2"})
    ASSERT_EQ(run({"run", "recordings.toml", "--quiet", "--jobs", jobs, "--contrast", "surprise",
                   "--output", std::string("jobs") + jobs})
                  .exit_code,
              0);
  const auto one = files_below(folder() / "jobs1"), two = files_below(folder() / "jobs2");
  EXPECT_GT(one.size(), 50u);
  ASSERT_EQ(one.size(), two.size());
  for (const auto& [name, bytes] : one) EXPECT_TRUE(two.at(name) == bytes) << name;
}

TEST_F(CommandRecordings, AnExperimentIsBegunFromTheirFolder) {
  const ProgramRun begun = run({"begin", "recordings", "--output", "begun.toml"});
  ASSERT_EQ(begun.exit_code, 0) << begun.err;
  expect_said(begun.out, {"4 participants", "63 channels at 250 Hz", "begun.toml"});
  const std::string text = read_file(folder() / "begun.toml", "experiment");
  expect_said(text, {"table = \"recordings/participants.tsv\"",
                     "recordings/{participant}/eeg/{participant}_task-pattern_eeg.edf",
                     "space = \"own\"", "zero = [\"FCz\"]", "name = \"steady\"", "name = \"late\"",
                     "value = \"interval_ms\""});
  const ProgramRun read = run({"inspect", "begun.toml"});
  EXPECT_EQ(read.exit_code, 0) << read.err;
  expect_said(read.out, {"sub-04", "FT9"});
  const ProgramRun again = run({"begin", "recordings", "--output", "begun.toml"});
  EXPECT_EQ(again.exit_code, 2);
  expect_said(again.err, {"begun.toml is there already"});
  EXPECT_EQ(read_file(folder() / "begun.toml", "experiment"), text);
  // A second task of one person: not used, said so, and the file stays readable.
  fs::copy(folder() / "recordings/sub-01/eeg/sub-01_task-pattern_eeg.edf",
           folder() / "recordings/sub-01/eeg/sub-01_task-zzz_eeg.edf");
  const ProgramRun two = run({"begin", "recordings", "--output", "two.toml"});
  expect_said(two.out, {"not used", "{participant}_task-zzz_eeg.edf (1)"});
  EXPECT_EQ(run({"inspect", "two.toml", "--participant", "sub-01"}).exit_code, 0);
  const ProgramRun nothing = run({"begin", "averages", "--output", "other.toml"});
  EXPECT_EQ(nothing.exit_code, 3);
  expect_said(nothing.err, {"no recording found", "sub-"});
  EXPECT_FALSE(fs::exists(folder() / "other.toml"));
}

TEST_F(CommandRecordings, ABrokenRecordingStopsOnlyItsParticipant) {
  const fs::path edf = folder() / "recordings/sub-02/eeg/sub-02_task-pattern_eeg.edf";
  const std::string whole = read_file(edf, "recording");
  write_file(edf, whole.substr(0, whole.size() - 1000));
  const ProgramRun done = run({"inspect", "recordings.toml"});
  write_file(edf, whole);
  EXPECT_EQ(done.exit_code, 4);
  expect_said(done.err, {"sub-02", "sub-02_task-pattern_eeg.edf", "records"});
  expect_said(done.out, {"sub-01", "sub-03", "sub-04"});
}

TEST_F(CommandRecordings, ProblemsOfTheirExperimentFileAreListedAtOnce) {
  const std::string good = read_file(folder() / "recordings.toml", "experiment");
  std::string text = with(good, "to_ms       = 500", "to_ms       = -200");
  text = with(text, "predictors = [\"surprise\"]", "predictors = [\"surprise\", \"surprise\"]");
  text = with(text, "predictor = \"surprise\"", "predictor = \"suprise\"");
  text = with(text, "low_pass_Hz = 40", "decimate = 2\nfilter_order = 3");
  text = with(text, "bad_are  = \"left out\"", "bad_are  = \"gone\"");
  write_file(folder() / "wrong.toml", text);
  const ProgramRun done = run({"inspect", "wrong.toml"});
  EXPECT_EQ(done.exit_code, 2);
  expect_said(done.err, {"'trials.to_ms' must lie after", "predictor 'surprise' is there twice",
                         "Did you mean 'surprise'?", "'trials.decimate' needs 'trials.low_pass_Hz'",
                         "'trials.filter_order' must be even", "'leads.bad_are' is \"gone\""});
  write_file(folder() / "nobody.toml",
             with(good, "[leads]", "[leads]\nbad = { sub-77 = [\"Fp1\"] }"));
  expect_said(run({"inspect", "nobody.toml"}).err,
              {"'leads.bad' names participant 'sub-77', who is not there"});
  write_file(folder() / "both.toml",
             good + "\n[averages]\nfile = \"a/{participant}_{condition}.tsv\"\ncounts = 3\n");
  expect_said(run({"inspect", "both.toml"}).err, {"there are both [averages] and [trials]"});
}

}  // namespace
}  // namespace headwater
