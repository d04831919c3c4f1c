// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/cli/command.hpp"

#include <fmt/core.h>

namespace headwater::cli {

void add_inspect(CLI::App& program, Outcome& outcome) {
  auto options = std::make_shared<ExperimentOptions>();
  auto* command = program.add_subcommand("inspect", "Read and check everything, estimate nothing");
  add_experiment_options(*command, *options);
  command->footer("Example: headwater inspect experiment.toml");
  command->callback([options, &outcome] {
    const Experiment experiment = read_selected(*options);
    const InspectReport report = inspect(experiment, stage_options(*options));
    if (options->json)
      fmt::print("{}\n", inspect_json(experiment, report).dump());
    else if (!options->quiet && !report.participants.empty())
      fmt::print("{}", aligned(inspect_table(report)));
    outcome.exit_code = report_failures(report.failures, !report.participants.empty());
  });
}

}  // namespace headwater::cli
