// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/cli/command.hpp"

#include <fmt/core.h>

#include <algorithm>
#include <utility>

namespace headwater::cli {
namespace {

/// Notes, each once, with whom it concerns.
void print_notes(const InspectReport& report) {
  std::vector<std::pair<std::string, Labels>> notes;
  for (const auto& participant : report.participants)
    for (const auto& note : participant.notes) {
      const std::string general = general_text(note, participant.name);
      auto found = std::find_if(notes.begin(), notes.end(),
                                [&](const auto& entry) { return entry.first == general; });
      if (found == notes.end()) found = notes.insert(found, {general, {}});
      if (!find_label(found->second, participant.name)) found->second.push_back(participant.name);
    }
  if (!notes.empty()) fmt::print("\nTo know:\n");
  for (const auto& [note, people] : notes)
    fmt::print("{}: {}\n",
               people.size() > 3 && people.size() == report.participants.size()
                   ? fmt::format("all {}", people.size())
                   : join_labels(people),
               note);
}

void print_inspection(const InspectReport& report, const std::vector<LeadFinding>& findings) {
  fmt::print("{}", aligned(inspect_table(report)));
  print_notes(report);
  if (!findings.empty())
    fmt::print("\nWho carries more than a share of an answer (sLORETA; each left out in turn):\n");
  for (const auto& finding : findings)
    fmt::print("{}, {}, {}: {}\n", finding.participant, finding.contrast, finding.window,
               finding.note);
}

}  // namespace

void add_inspect(CLI::App& program, Outcome& outcome) {
  auto options = std::make_shared<ExperimentOptions>();
  auto* command = program.add_subcommand(
      "inspect", "Read and check everything, and name what carries an answer alone; write nothing");
  add_experiment_options(*command, *options);
  command->footer("Example: headwater inspect experiment.toml");
  command->callback([options, &outcome] {
    const Experiment experiment = read_selected(*options);
    const InspectReport report = inspect(experiment, stage_options(*options));
    const auto findings = find_carriers(experiment, report, stage_options(*options));
    if (options->json)
      fmt::print("{}\n", inspect_json(experiment, report, findings).dump());
    else if (!options->quiet && !report.participants.empty())
      print_inspection(report, findings);
    outcome.exit_code = report_failures(report.failures, !report.participants.empty());
  });
}

}  // namespace headwater::cli
