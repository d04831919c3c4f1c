// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/cli/command.hpp"

namespace headwater::cli {

void add_run(CLI::App& program, Outcome& outcome) {
  auto options = std::make_shared<ExperimentOptions>();
  auto* command = program.add_subcommand("run", "All stages: inspect, then locate");
  add_experiment_options(*command, *options);
  command->footer("Example: headwater run experiment.toml --jobs 2");
  command->callback([options, &outcome] { outcome.exit_code = locate_and_print(*options, true); });
}

}  // namespace headwater::cli
