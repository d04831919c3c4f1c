// SPDX-License-Identifier: GPL-3.0-or-later
// Faults of the experiment file: all of them are told at once, each at its line and column, before
// anything is read or written.
#include "small_experiment.hpp"

#include <gtest/gtest.h>

namespace headwater {
namespace {

/// Runs with this experiment file; expects exit code 2, each of `parts`, and nothing written.
void expect_refused(const SmallExperiment& small, const std::string& text,
                    const std::vector<std::string>& parts) {
  small.write("experiment.toml", text);
  const auto before = files_below(small.folder);
  for (const char* command : {"run", "inspect"}) {
    const ProgramRun run = run_program({command, "experiment.toml"}, small.folder);
    EXPECT_EQ(run.exit_code, 2) << run.err;
    expect_said(run.err, parts);
    EXPECT_EQ(run.out, "");
  }
  EXPECT_EQ(files_below(small.folder), before);
}

void expect_refused(const std::string& text, const std::vector<std::string>& parts) {
  const SmallExperiment small;
  expect_refused(small, text, parts);
}

const char* const kAllWrong = R"(title = 5
outptu = "results"
seed = -1
[participants]
table = "people.tsv"
[averages]
file = "averages/{participant}.tsv"
counts = "nowhere.tsv"
unit = "kV"
[montge]
drop = "X"
[[conditions]]
name = "late"
beat = "odd"
[[conditions]]
name = "late"
beat = 3
[[contrasts]]
name = "a"
weights = { lat = 1, late = "x" }
[[contrasts]]
name = "A b"
effect = { bea = ["odd", "even"] }
[[contrasts]]
name = "A-b"
effect = { beat = ["odd", "evn"] }
[[contrasts]]
name = "neither"
[[windows]]
name = "w"
from_ms = 100
to_ms = 80
[[windows]]
name = "x"
from_ms = 1
to_ms = "2"
[[windows]]
name = "w"
from_ms = 1
to_ms = 2
contrasts = ["nither"]
[head]
radius_mm = 900
shells = [0.9, 0.8, 1.0]
[grid]
spacing_mm = 1
[noise]
from = "table"
shrinkage = 2
baseline_ms = [1]
[inverse]
methods = ["slorta", "sloreta", "sloreta"]
regularisation = { snr = -3 }
[lcmv]
orientation = "max"
from_ms = 300
to_ms = 200
[[regions]]
name = "r"
gyri = ["STG"]
lobe = "temporal"
[[regions]]
name = "r"
gyri = ["STGG"]
side = "up"
[files]
series = "yes"
)";

TEST(FaultExperimentFile, EveryProblemIsToldAtOnceWithItsPlace) {
  const std::string at = "experiment.toml:";
  expect_refused(
      kAllWrong,
      {at + "1:9: 'title' is a number: expected text",
       at + "2:10: unknown key 'outptu'. Did you mean 'output'?",
       at + "3:8: 'seed' is -1",
       at + "5:9: 'participants.table': there is no file",
       at + "7:8: 'averages.file' lacks {condition}",
       at + "8:10: 'averages.counts': there is no file",
       at + "9:8: 'averages.unit' is \"kV\": expected uV, mV and V",
       at + "10:1: unknown key 'montge'. Did you mean 'montage'?",
       at + "15:1: condition 'late' is there twice",
       at + "17:8: 'conditions[].beat' is a number: expected text",
       at + "20:19: contrast 'a' weights condition 'lat'",
       "Did you mean 'late'?",
       at + "20:29: 'contrasts[].weights.late' is text: expected a number",
       at + "23:10: contrast 'A b'",
       "no condition has a factor 'bea'. Did you mean 'beat'?",
       at + "24:1: contrasts 'A b' and 'A-b' would share their files",
       at + "26:10: contrast 'A-b'",
       "factor 'beat' has no level 'evn'",
       at + "27:1: contrast 'neither' needs one of weights, an effect or a predictor",
       at + "29:1: window 'w' ends before it begins",
       at + "36:9: 'windows[].to_ms' is text: expected a number",
       at + "37:1: windows 'w' and 'w' would share their files",
       at + "37:1: window 'w' names contrast 'nither', which is not there. Did you mean 'neither'?",
       at + "43:13: 'head.radius_mm' is 900: expected 30 to 200 mm",
       at + "44:10: Shell 2 has radius",
       at + "46:14: 'grid.spacing_mm' is 1: expected 4 to 12 mm",
       at + "48:8: 'noise.table' is missing",
       at + "49:13: 'noise.shrinkage' is 2: expected 0 to 1",
       at + "50:15: 'noise.baseline_ms' needs two numbers",
       at + "52:12: 'inverse.methods' is \"slorta\"",
       "Did you mean 'sloreta'?",
       at + "52:11: method 'sloreta' is there twice",
       at + "53:18: 'inverse.regularisation'",
       "above 0",
       at + "55:15: 'lcmv.orientation' is \"max\": expected vector and maximum-power",
       at + "57:9: 'lcmv.to_ms' must lie after",
       at + "58:1: region 'r' needs either gyri or a lobe",
       at + "62:1: Region 'r': no gyrus 'STGG'. Did you mean 'STG'?",
       at + "62:1: regions 'r' and 'r' would share",
       at + "65:8: 'regions[].side' is \"up\"",
       at + "67:10: 'files.series' is text: expected true or false"});
}

TEST(FaultExperimentFile, WhatIsMissingIsNamed) {
  expect_refused("", {"no [[conditions]]", "no [[windows]]", "neither [averages]", "nor [trials]"});
  expect_refused(with(kSmallExperiment, "counts = \"trials.tsv\"\n", ""),
                 {"experiment.toml:3:1: 'averages.counts' is missing"});
  expect_refused(with(kSmallExperiment, "from_ms = 80\n", ""),
                 {"experiment.toml:17:1: 'windows[].from_ms' is missing"});
  expect_refused(with(kSmallExperiment, "averages/{", "avrages/{"),
                 {"experiment.toml:4:8: no participant: no file fits"});
}

TEST(FaultExperimentFile, AMistakeOfSyntaxIsPlaced) {
  expect_refused(with(kSmallExperiment, "from_ms = 80", "from_ms = = 80"),
                 {"experiment.toml:19:11: "});
  expect_refused(with(kSmallExperiment, "from_ms = 80", "from_ms = 80\nfrom_ms = 90"),
                 {"experiment.toml:20:", "from_ms"});
  expect_refused(with(kSmallExperiment, "name = \"late\"", "name = \"late"),
                 {"experiment.toml:9:"});
  expect_refused("\xff\xfe\x01", {"experiment.toml:1:"});
}

TEST(FaultExperimentFile, AFileThatIsNotThereIsNamed) {
  const SmallExperiment small;
  for (const char* name : {"nowhere.toml", "averages"}) {
    const ProgramRun run = run_program({"run", name}, small.folder);
    EXPECT_EQ(run.exit_code, 2);
    expect_said(run.err, {name, "the experiment file cannot be read"});
  }
}

TEST(FaultExperimentFile, NamesThatCannotNameFilesAreRefused) {
  expect_refused(with(kSmallExperiment, "name = \"late minus steady\"", "name = \"\""),
                 {"experiment.toml:15:8: 'contrasts[].name' is empty"});
  expect_refused(
      std::string(kSmallExperiment) + "[[regions]]\nname = \"r\"\ngyri = [\"Nowhere\"]\n",
      {"experiment.toml:26:1: Region 'r': no gyrus 'Nowhere'"});
  expect_refused(std::string(kSmallExperiment) + "[noise]\nbaseline_ms = [0, -100]\n",
                 {"experiment.toml:27:15: 'noise.baseline_ms' must begin before it ends"});
}

TEST(FaultExperimentFile, ParticipantsMustMakeFoldersOfTheirOwn) {
  const SmallExperiment small;
  const std::string text =
      std::string("output = \"results\"\n[participants]\ntable = \"people.tsv\"\n") +
      std::string(kSmallExperiment).substr(std::string(kSmallExperiment).find("[averages]"));
  small.write("people.tsv", "participant_id\nsub-01\n../sub-02\n..\nmean\nn/a\nsub-01\n");
  expect_refused(small, text,
                 {"experiment.toml:3:9: '../sub-02' cannot name a participant",
                  "'..' cannot name a participant", "'mean' cannot name a participant",
                  "'n/a' cannot name a participant", "participant 'sub-01' is in the table twice"});
  small.write("people.tsv", "subject\nsub-01\n");
  expect_refused(small, text, {"experiment.toml:3:9: ", "people.tsv", "participant_id", "subject"});
  small.write("people.tsv", "participant_id\nsub-01\n");
  expect_refused(
      small, with(text, "[averages]", "leave_out = [\"sub-1\"]\n[averages]"),
      {"experiment.toml:4:13: there is no participant 'sub-1' to leave out. Did you mean "
       "'sub-01'?"});
}

TEST(FaultExperimentFile, AGrandMeanAmongTheAveragesMayBeLeftOut) {
  const SmallExperiment small;
  for (const char* condition : {"late", "steady"})
    std::filesystem::copy_file(small.average("sub-01", condition),
                               small.average("mean", condition));
  expect_refused(small, kSmallExperiment, {"'mean' cannot name a participant", "leave_out"});
  small.write("experiment.toml", with(kSmallExperiment, "[averages]",
                                      "[participants]\nleave_out = [\"mean\"]\n[averages]"));
  EXPECT_EQ(small.run().exit_code, 0);
}

}  // namespace
}  // namespace headwater
