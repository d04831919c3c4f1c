// SPDX-License-Identifier: GPL-3.0-or-later
// Faults of the data: what is wrong with one person stops that person (exit code 4), what is wrong
// with all stops the run (3) before anything is written.
#include "small_experiment.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <sstream>

namespace headwater {
namespace {

namespace fs = std::filesystem;
using Cells = std::vector<std::string>;

/// The people whom the program names as failed: "headwater: sub-01 and sub-02: reason".
Labels failed_people(const std::string& said) {
  Labels people;
  std::istringstream lines(said);
  for (std::string line; std::getline(lines, line);) {
    if (line.rfind("headwater: ", 0) != 0) continue;
    const std::string names = line.substr(11, line.find(": ", 11) - 11);
    for (const char* person : {"sub-01", "sub-02", "sub-03", "mean"})
      if (holds(names, person)) people.push_back(person);
  }
  std::sort(people.begin(), people.end());
  return people;
}

/// These people failed, each named once, with all `parts` said.
void expect_told_of(const std::string& said, const Labels& people, const Cells& parts) {
  EXPECT_EQ(failed_people(said), people) << said;
  expect_said(said, parts);
}

/// sub-02 fails, the two others and their mean are done.
void expect_one_failed(const SmallExperiment& small, const Cells& parts) {
  const ProgramRun run = small.run();
  EXPECT_EQ(run.exit_code, 4);
  expect_told_of(run.err, {"sub-02"}, parts);
  const fs::path results = small.folder / "results";
  EXPECT_FALSE(fs::exists(results / "sub-02"));
  expect_whole_files(results);
  const Table summary = read_table(results / "summary.tsv", "summary");
  Labels done;
  for (const auto& row : summary.rows)
    if (!find_label(done, row[0])) done.push_back(row[0]);
  EXPECT_EQ(done, (Labels{"sub-01", "sub-03", "mean"}));
}

void expect_all_failed(const SmallExperiment& small, const Cells& parts) {
  const ProgramRun run = small.run();
  EXPECT_EQ(run.exit_code, 3);
  expect_told_of(run.err, {"sub-01", "sub-02", "sub-03"}, parts);
  EXPECT_FALSE(fs::exists(small.folder / "results"));
}

/// Changes the cells of one line of sub-02's tables, and has everything read.
template <typename Change>
void expect_line_refused(int line, const Change& change, const Cells& parts) {
  const SmallExperiment small;
  small.change_averages(
      [&](const std::string& text) {
        return change_rows(text, [&](int number, Cells& cells) {
          if (number == line) change(cells);
        });
      },
      "sub-02");
  const ProgramRun run = run_program({"inspect", "experiment.toml"}, small.folder);
  EXPECT_EQ(run.exit_code, 4);
  expect_told_of(run.err, {"sub-02"}, parts);
  EXPECT_TRUE(holds(run.out, "\nsub-03 "));
  EXPECT_FALSE(holds(run.out, "\nsub-02 "));
}

TEST(FaultAverages, NothingIsWrongWithTheSmallExperiment) {
  const SmallExperiment small;
  const ProgramRun run = small.run();
  EXPECT_EQ(run.exit_code, 0);
  EXPECT_EQ(run.err, "");
  expect_whole_files(small.folder / "results");
}

TEST(FaultAverages, CellsThatAreNoNumbersAreNamedByLineAndColumn) {
  const auto put = [](const char* text) { return [text](Cells& cells) { cells[3] = text; }; };
  for (const char* text : {"abc", "nan", "inf", "n/a", "", "1.5.2", "0x1p3"})
    expect_line_refused(7, put(text),
                        {"sub-02_late.tsv, line 7, column 'AF3': found '" + std::string(text) + "'",
                         "expected a finite number"});
  expect_line_refused(7, put("1,5"), {"line 7, column 'AF3': found '1,5'", "decimal"});
}

TEST(FaultAverages, AReasonThatAllShareIsSaidOnce) {
  const SmallExperiment small;
  small.change_averages([](const std::string& text) { return with(text, "\tFz\t", "\tFzz\t"); });
  const ProgramRun run = small.run();
  EXPECT_EQ(run.exit_code, 3);
  expect_said(run.err, {"headwater: sub-01, sub-02 and sub-03: ", "'Fzz' is not a name"});
  EXPECT_EQ(run.err.find("Fzz"), run.err.rfind("Fzz"));
}

TEST(FaultAverages, RowsOfOtherLengthAreNamed) {
  expect_line_refused(7, [](Cells& cells) { cells.pop_back(); },
                      {"sub-02_late.tsv, line 7: 32 cells found, 33 expected"});
  expect_line_refused(9, [](Cells& cells) { cells.push_back("1"); },
                      {"sub-02_late.tsv, line 9: 34 cells found, 33 expected"});
}

TEST(FaultAverages, ChannelNamesMustBeKnownAndDiffer) {
  expect_line_refused(1, [](Cells& cells) { cells[7] = "F3"; },
                      {"sub-02_late.tsv, line 1: repeated column names: F3"});
  expect_line_refused(1, [](Cells& cells) { cells[7] = "f3"; }, {"more than one channel", "f3"});
  expect_line_refused(1,
                      [](Cells& cells) {
                        cells[7] = "Fzz";
                        cells[30] = "EOG";
                      },
                      {"'Fzz' is not a name of the 10-5 system", "'EOG' is not a name"});
  expect_line_refused(1, [](Cells& cells) { cells[0] = "time"; },
                      {"the first column must be time_s"});
}

TEST(FaultAverages, ChannelsMustBeTheSameInEveryCondition) {
  const SmallExperiment small;
  const auto path = small.average("sub-02", "steady");
  write_file(path, change_rows(read_file(path, "average"),
                               [](int, Cells& cells) { cells.erase(cells.begin() + 7); }));
  expect_one_failed(small, {"sub-02_steady.tsv lacks Fz", "sub-02_late.tsv"});
}

TEST(FaultAverages, FewerThanEightElectrodesAreTooFew) {
  const SmallExperiment small;
  small.change_averages([](const std::string& text) {
    return change_rows(text, [](int, Cells& cells) { cells.resize(8); });
  });
  expect_all_failed(small, {"7 channels left, at least 8 are needed"});
}

TEST(FaultAverages, AWrongUnitIsToldWithTheRightOne) {
  const auto scaled = [](double factor, const Cells& parts) {
    const SmallExperiment small;
    small.change_numbers(
        [&](NumberTable& table) { table.values.rightCols(table.values.cols() - 1) *= factor; });
    expect_all_failed(small, parts);
  };
  scaled(1e-3, {"read in uV", "averages.unit = \"mV\""});
  scaled(1e-6, {"read in uV", "averages.unit = \"V\""});
  scaled(1e3, {"read in uV", "check the table"});
  const SmallExperiment small;
  small.write("experiment.toml", with(kSmallExperiment, "counts =", "unit = \"V\"\ncounts ="));
  expect_all_failed(small, {"read in V", "averages.unit = \"uV\""});
  const SmallExperiment milliseconds;
  milliseconds.change_numbers([](NumberTable& table) { table.values.col(0) *= 1e3; });
  expect_all_failed(milliseconds, {"column time_s", "look like ms"});
}

TEST(FaultAverages, TimesMustAgreeBetweenConditions) {
  const SmallExperiment small;
  const auto path = small.average("sub-02", "steady");
  NumberTable table = read_number_table(path, "average");
  table.values.col(0).array() += 0.004;
  write_file(path, number_table_text(table.columns, {}, table.values, 9));
  expect_one_failed(small, {"sub-02_steady.tsv has 76 samples from -0.096 to 0.204 s",
                            "expected 76 samples from -0.1 to 0.2 s"});
}

TEST(FaultAverages, PeopleWithOtherTimesAreNamedAndHaveNoMean) {
  const SmallExperiment small;
  small.change_numbers(
      [](NumberTable& table) { table.values.conservativeResize(60, Eigen::NoChange); }, "sub-02");
  const ProgramRun run = small.run();
  EXPECT_EQ(run.exit_code, 4);
  expect_told_of(run.err, {"mean"}, {"the samples of sub-02 differ from those of sub-01"});
  EXPECT_FALSE(fs::exists(small.folder / "results" / "mean"));
  EXPECT_TRUE(fs::exists(small.folder / "results" / "sub-02"));
}

TEST(FaultAverages, AWindowOutsideTheSamplesIsToldByInspect) {
  const SmallExperiment small;
  small.change_numbers(
      [](NumberTable& table) { table.values.conservativeResize(40, Eigen::NoChange); });
  const ProgramRun run = run_program({"inspect", "experiment.toml"}, small.folder);
  EXPECT_EQ(run.exit_code, 3);
  expect_said(run.err, {"Window 'mismatch' (80 to 120 ms) holds no sample", "-100 to 56 ms"});
  expect_all_failed(small, {"Window 'mismatch'"});
}

TEST(FaultAverages, CountsMustBeThereAndBeCounts) {
  const auto counted = [](const char* row, const char* instead) {
    SmallExperiment small;
    small.write("trials.tsv", with(read_file(small.folder / "trials.tsv", "counts"), row, instead));
    return small.run();
  };
  const ProgramRun zero = counted("sub-02\tlate\t100", "sub-02\tlate\t0");
  EXPECT_EQ(zero.exit_code, 4);
  expect_told_of(zero.err, {"sub-02"}, {"trials.tsv", "0 trials for participant 'sub-02'", "late"});
  const ProgramRun none = counted("sub-02\tlate\t100\n", "");
  EXPECT_EQ(none.exit_code, 4);
  expect_told_of(none.err, {"sub-02"}, {"no row for participant 'sub-02', condition 'late'"});
  const ProgramRun twice = counted("sub-02\tlate\t100\n", "sub-02\tlate\t9\nsub-02\tlate\t9\n");
  EXPECT_EQ(twice.exit_code, 4);
  expect_told_of(twice.err, {"sub-02"}, {"2 rows for participant 'sub-02'"});
  for (const char* text : {"-3", "12.5", "many"}) {
    const ProgramRun wrong =
        counted("sub-02\tlate\t100", ("sub-02\tlate\t" + std::string(text)).c_str());
    EXPECT_EQ(wrong.exit_code, 3);
    expect_said(wrong.err, {"trials.tsv", "line 4, column trials: found '" + std::string(text)});
  }
}

TEST(FaultAverages, PositionsAboutAnotherOriginAreRefused) {
  const SmallExperiment small;
  const Montage montage = standard_montage(small.leads, 92 * kMillimetre);
  const auto inspect_shifted = [&](double up_mm) {
    std::string table = "name\tx_mm\ty_mm\tz_mm\n";
    for (std::size_t k = 0; k < small.leads.size(); ++k) {
      const Eigen::Vector3d at = montage.positions.col(static_cast<Eigen::Index>(k)) / kMillimetre;
      table += small.leads[k] + "\t" + format_number(at.x()) + "\t" + format_number(at.y()) + "\t" +
               format_number(at.z() + up_mm) + "\n";
    }
    small.write("cap.tsv", table);
    std::string experiment = kSmallExperiment;
    experiment.replace(experiment.find("\"standard\""), 10, "\"cap.tsv\"");
    small.write("experiment.toml", experiment);
    return run_program({"inspect", "experiment.toml"}, small.folder);
  };
  EXPECT_EQ(inspect_shifted(0).exit_code, 0);
  const ProgramRun run = inspect_shifted(45);
  EXPECT_EQ(run.exit_code, 3);
  EXPECT_TRUE(holds(run.err, "cap.tsv: the sphere through the electrodes has its centre at"));
  EXPECT_TRUE(holds(run.err, "45 mm from the origin"));
}

TEST(FaultAverages, AMissingFileStopsOnePerson) {
  const SmallExperiment small;
  fs::remove(small.average("sub-02", "steady"));
  expect_one_failed(small, {"sub-02_steady.tsv", "No such file"});
}

TEST(FaultAverages, FlatAndEmptyTablesAreNamed) {
  const SmallExperiment flat;
  flat.change_numbers([](NumberTable& t) { t.values.rightCols(t.values.cols() - 1).setZero(); },
                      "sub-02");
  expect_one_failed(flat, {"sub-02_late.tsv: every channel is flat"});
  for (const char* text : {"", "time_s\tFz\n", "time_s,Fz,Cz\n0,1,2\n"}) {
    const SmallExperiment small;
    write_file(small.average("sub-02", "late"), text);
    const ProgramRun run = run_program({"inspect", "experiment.toml"}, small.folder);
    EXPECT_EQ(run.exit_code, 4);
    expect_told_of(run.err, {"sub-02"}, {"sub-02_late.tsv"});
  }
}

TEST(FaultAverages, ASingularCovarianceSaysWhatToDo) {
  const SmallExperiment small;
  small.write("experiment.toml",
              std::string(kSmallExperiment) + "[noise]\nshrinkage = 0\nbaseline_ms = [-40, 0]\n");
  // 11 samples of 2 conditions, each with its mean removed: rank 20 of 31.
  expect_all_failed(small, {"singular", "rank 20 of 31", "shrinkage"});
  const SmallExperiment few;
  few.write("experiment.toml", std::string(kSmallExperiment) + "[noise]\nbaseline_ms = [-10, 0]\n");
  expect_all_failed(few, {"3 samples in the baseline", "at least 5"});
}

TEST(FaultAverages, AnOutputThatCannotBeWrittenIsAFailedResource) {
  const SmallExperiment small;
  small.write("plain", "x");
  for (const char* output : {"plain/results", "plain"}) {
    const ProgramRun run = small.run({"--output", output});
    EXPECT_EQ(run.exit_code, 5);
    expect_said(run.err, {output, "cannot be written", "Not a directory"});
  }
  EXPECT_EQ(read_file(small.folder / "plain", "file"), "x");
}

TEST(FaultAverages, ANameThatLeadsOutOfTheFolderStaysUnread) {
  const SmallExperiment small;  // results of a participant go where the results are, nowhere else
  small.write("people.tsv", "participant_id\nsub-01\n../averages/sub-02\n");
  small.write(
      "experiment.toml",
      std::string("[participants]\ntable = \"people.tsv\"\n") +
          std::string(kSmallExperiment).substr(std::string(kSmallExperiment).find("[averages]")));
  const auto before = files_below(small.folder);
  EXPECT_EQ(small.run().exit_code, 2);
  EXPECT_EQ(files_below(small.folder), before);
}

}  // namespace
}  // namespace headwater
