// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/cli/command.hpp"

#include <fmt/core.h>

#include <algorithm>
#include <cstdio>

namespace headwater::cli {

void add_experiment_options(CLI::App& command, ExperimentOptions& options) {
  command.add_option("FILE", options.file, "Experiment file (see `headwater keys`)")->required();
  command
      .add_option("--participant", options.participants,
                  "Only this participant; 'mean' is one; may be repeated")
      ->allow_extra_args(false);
  command.add_option("--contrast", options.contrasts, "Only this contrast; may be repeated")
      ->allow_extra_args(false);
  command
      .add_option("--method", options.methods,
                  "Only this method: minimum-norm, sloreta, eloreta or lcmv; may be repeated")
      ->allow_extra_args(false);
  command.add_option("--output", options.output,
                     "Results folder, in place of the experiment file's");
  command
      .add_option("--jobs", options.jobs,
                  "Participants at a time (default: one for each processor)")
      ->check(CLI::NonNegativeNumber);
  command
      .add_option("--seed", options.seed, "Seed of random draws, in place of the experiment file's")
      ->check(CLI::NonNegativeNumber);
  command.add_flag("--quiet", options.quiet, "No progress, no summary");
  command.add_flag("--verbose", options.verbose, "Say more");
  command.add_flag("--json", options.json, "Summary as JSON on standard output");
}

Experiment read_selected(const ExperimentOptions& options) {
  Experiment experiment = select(read_experiment(options.file), stage_options(options));
  if (!options.output.empty()) experiment.output = std::filesystem::absolute(options.output);
  if (options.seed >= 0) experiment.seed = static_cast<std::uint64_t>(options.seed);
  return experiment;
}

StageOptions stage_options(const ExperimentOptions& options) {
  return {options.participants, options.contrasts, options.methods, options.jobs, {}};
}

int report_failures(const std::vector<Failure>& failures, bool any_done) {
  std::vector<std::pair<std::string, Labels>> reasons;  // what many share is said once
  for (const auto& failure : failures) {
    auto found = std::find_if(reasons.begin(), reasons.end(),
                              [&](const auto& entry) { return entry.first == failure.reason; });
    if (found == reasons.end()) found = reasons.insert(found, {failure.reason, {}});
    found->second.push_back(failure.participant);
  }
  for (const auto& [reason, people] : reasons)
    fmt::print(stderr, "headwater: {}: {}\n", join_labels(people), reason);
  if (failures.empty()) return 0;
  return static_cast<int>(any_done ? Trouble::some_participants : failures[0].trouble);
}

std::string aligned(const OutputTable& table) {
  std::vector<std::size_t> widths;
  for (const auto& column : table.columns) widths.push_back(column.name.size());
  for (const auto& row : table.rows)
    for (std::size_t k = 0; k < row.size(); ++k) widths[k] = std::max(widths[k], row[k].size());
  std::string text;
  const auto add = [&](const auto& cell_of) {
    std::string line;
    for (std::size_t k = 0; k < widths.size(); ++k)
      line += fmt::format("{:<{}}", cell_of(k), widths[k] + 2);
    line.erase(line.find_last_not_of(' ') + 1);
    text += line + "\n";
  };
  add([&](std::size_t k) { return table.columns[k].name; });
  for (const auto& row : table.rows) add([&](std::size_t k) { return row[k]; });
  return text;
}

}  // namespace headwater::cli
