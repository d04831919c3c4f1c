// SPDX-License-Identifier: GPL-3.0-or-later
// What the program says of itself: its keys, its commands, its version.
#include "base_scratch.hpp"
#include "program.hpp"
#include "small_experiment.hpp"

#include <headwater/app/keys.hpp>
#include <headwater/base/json.hpp>
#include <headwater/base/toml.hpp>
#include <headwater/base/version.hpp>

#include <gtest/gtest.h>

#include <set>
#include <sstream>

namespace headwater {
namespace {

const Labels kCommands{"example", "begin", "inspect", "locate", "run", "draw", "leadfield", "keys"};

/// Lines that are not set in: the names of the keys.
std::set<std::string> listed_keys(const std::string& text) {
  std::set<std::string> names;
  std::istringstream lines(text);
  for (std::string line; std::getline(lines, line);)
    if (!line.empty() && line[0] != ' ') names.insert(line);
  return names;
}

/// Keys of a tree as the list writes them: a.b, a[].b.
void collect_keys(const TomlValue& value, const std::string& prefix, std::set<std::string>& names,
                  const std::set<std::string>& known) {
  if (!prefix.empty() && known.count(prefix)) {
    names.insert(prefix);
    return;
  }
  if (value.is_table()) {
    for (const auto& [name, member] : std::get<TomlValue::Table>(value.value))
      collect_keys(member, prefix.empty() ? name : prefix + "." + name, names, known);
  } else if (value.is_array()) {
    for (const auto& item : std::get<TomlValue::Array>(value.value))
      collect_keys(item, prefix + "[]", names, known);
  } else {
    names.insert(prefix);
  }
}

TEST(CommandKeys, ListsEveryKey) {
  const Scratch scratch;
  const ProgramRun run = run_program({"keys"}, scratch.folder);
  ASSERT_EQ(run.exit_code, 0);
  EXPECT_EQ(run.err, "");
  std::set<std::string> expected;
  for (const auto& record : key_records()) expected.insert(record.name);
  EXPECT_EQ(listed_keys(run.out), expected);
}

TEST(CommandKeys, APartOfTheNameNarrowsTheList) {
  const Scratch scratch;
  const ProgramRun run = run_program({"keys", "lcmv"}, scratch.folder);
  ASSERT_EQ(run.exit_code, 0);
  EXPECT_EQ(listed_keys(run.out),
            (std::set<std::string>{"lcmv.from_ms", "lcmv.to_ms", "lcmv.from", "lcmv.table",
                                   "lcmv.regularisation", "lcmv.output", "lcmv.orientation",
                                   "lcmv.mirror_paired"}));
  const ProgramRun none = run_program({"keys", "zzz"}, scratch.folder);
  EXPECT_EQ(none.exit_code, 2);
  expect_said(none.err, {"zzz"});
}

TEST(CommandKeys, KnowsEveryKeyOfTheExampleThatItWrites) {
  const Scratch scratch;
  const auto known = listed_keys(run_program({"keys"}, scratch.folder).out);
  const ProgramRun written = run_program({"example", "late-beats"}, scratch.folder);
  ASSERT_EQ(written.exit_code, 0) << written.err;
  std::set<std::string> used;
  collect_keys(read_toml(scratch.folder / "late-beats" / "experiment.toml"), "", used, known);
  EXPECT_GT(used.size(), 20u);
  for (const auto& name : used) {
    const bool factor = name.rfind("conditions[].", 0) == 0 && known.count("conditions[].*");
    EXPECT_TRUE(known.count(name) || factor) << name;
  }
}

TEST(CommandHelp, OfEveryCommandEndsWithAnExample) {
  const Scratch scratch;
  for (const auto& command : kCommands) {
    const ProgramRun run = run_program({command, "--help"}, scratch.folder);
    EXPECT_EQ(run.exit_code, 0) << command;
    EXPECT_EQ(run.err, "");
    std::istringstream lines(run.out);
    std::string line, last;
    while (std::getline(lines, line))
      if (!line.empty()) last = line;
    EXPECT_EQ(last.rfind("Example: headwater " + command, 0), 0u) << run.out;
  }
}

TEST(CommandHelp, OfTheProgramNamesEveryCommandAndTheCaution) {
  const Scratch scratch;
  const ProgramRun run = run_program({"--help"}, scratch.folder);
  EXPECT_EQ(run.exit_code, 0);
  for (const auto& command : kCommands)
    EXPECT_TRUE(holds(run.out, "\n  " + command + " ")) << command;
  EXPECT_TRUE(holds(run.out, caution()));
}

TEST(CommandVersion, SaysVersionAndCaution) {
  const Scratch scratch;
  const ProgramRun run = run_program({"--version"}, scratch.folder);
  EXPECT_EQ(run.exit_code, 0);
  EXPECT_EQ(run.out, "headwater " + version() + "\n" + caution() + "\n");
  EXPECT_TRUE(holds(caution(), "not"));
}

TEST(CommandLine, MistakesAreNamedAndSuggested) {
  const SmallExperiment small;
  const auto refuse = [&](const std::vector<std::string>& arguments,
                          const std::vector<std::string>& parts) {
    const ProgramRun run = run_program(arguments, small.folder);
    EXPECT_EQ(run.exit_code, 2) << run.err;
    expect_said(run.err, parts);
    EXPECT_EQ(run.out, "");
  };
  refuse({}, {"subcommand is required"});
  refuse({"runn", "experiment.toml"}, {"no command 'runn'", "Did you mean 'run'?"});
  refuse({"run"}, {"FILE is required"});
  refuse({"run", "experiment.toml", "--job", "2"}, {"--job"});
  refuse({"run", "experiment.toml", "--jobs", "-1"}, {"--jobs"});
  refuse({"run", "experiment.toml", "--jobs", "two"}, {"--jobs"});
  refuse({"run", "experiment.toml", "--participant", "sub-9", "--contrast", "late minus stedy",
          "--method", "loreta"},
         {"no participant 'sub-9'", "no contrast 'late minus stedy'",
          "Did you mean 'late minus steady'?", "no method 'loreta'", "Did you mean 'sloreta'?"});
  EXPECT_FALSE(std::filesystem::exists(small.folder / "results"));
}

TEST(CommandLine, ASelectionIsAllThatIsDone) {
  const SmallExperiment small;
  const ProgramRun run = small.run(
      {"--participant", "sub-02", "--method", "minimum-norm", "--output", "chosen", "--json"});
  ASSERT_EQ(run.exit_code, 0) << run.err;
  const Table summary = read_table(small.folder / "chosen" / "summary.tsv", "summary");
  for (const auto& row : summary.rows) {
    EXPECT_EQ(row[summary.column("participant_id")], "sub-02");
    EXPECT_EQ(row[summary.column("method")], "minimum-norm");
  }
  EXPECT_FALSE(std::filesystem::exists(small.folder / "results"));
  EXPECT_FALSE(std::filesystem::exists(small.folder / "chosen" / "mean"));
  const Json json = parse_json(run.out, "standard output");
  ASSERT_TRUE(json.find("sources"));
  EXPECT_EQ(json.find("sources")->items().size(), summary.rows.size());
}

TEST(CommandLine, InspectReadsEverythingAndWritesNothing) {
  const SmallExperiment small;
  const auto before = files_below(small.folder);
  const ProgramRun run = run_program({"inspect", "experiment.toml"}, small.folder);
  EXPECT_EQ(run.exit_code, 0) << run.err;
  expect_said(run.out, {"sub-01", "sub-02", "sub-03", "participant_id"});
  EXPECT_EQ(files_below(small.folder), before);
  const ProgramRun machine = run_program({"inspect", "experiment.toml", "--json"}, small.folder);
  EXPECT_EQ(parse_json(machine.out, "standard output").find("participants")->items().size(), 3u);
}

TEST(CommandLine, ExampleWritesIntoNothingThatIsThere) {
  const Scratch scratch;
  write_file(scratch.folder / "mine" / "notes.txt", "keep");
  const auto before = files_below(scratch.folder);
  const ProgramRun run = run_program({"example", "mine"}, scratch.folder);
  EXPECT_EQ(run.exit_code, 2) << run.err;
  expect_said(run.err, {"mine"});
  EXPECT_EQ(files_below(scratch.folder), before);
}

}  // namespace
}  // namespace headwater
