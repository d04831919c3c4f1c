// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/cli/command.hpp"

#include <fmt/core.h>

namespace headwater::cli {
namespace {

void print_inspection(const InspectReport& report, const std::vector<LeadFinding>& findings) {
  fmt::print("{}", aligned(inspect_table(report)));
  bool any = false;
  for (const auto& participant : report.participants)
    for (const auto& note : participant.notes) {
      fmt::print("{}{}: {}\n", any ? "" : "\nTo know:\n", participant.name, note);
      any = true;
    }
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
