// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/cli/command.hpp"

#include <headwater/app/begin.hpp>
#include <headwater/base/atomic_file.hpp>
#include <headwater/base/error.hpp>

#include <fmt/core.h>

#include <filesystem>

namespace headwater::cli {

void add_begin(CLI::App& program, Outcome& outcome) {
  struct Options {
    std::string folder, output = "experiment.toml";
    bool quiet = false;
  };
  auto options = std::make_shared<Options>();
  auto* command =
      program.add_subcommand("begin", "Write a commented experiment file from a BIDS folder");
  command->add_option("FOLDER", options->folder, "BIDS folder with EDF recordings")->required();
  command->add_option("--output", options->output, "Experiment file to write")
      ->capture_default_str();
  command->add_flag("--quiet", options->quiet, "Say nothing");
  command->footer("Example: headwater begin recordings --output begun.toml");
  command->callback([options, &outcome] {
    if (std::filesystem::exists(options->output))
      throw ExperimentError(
          fmt::format("{} is there already: nothing was written. Give another name with --output.",
                      options->output));
    const BegunExperiment begun = begin_experiment(options->folder, options->output);
    write_file(options->output, begun.text);
    if (!options->quiet)
      fmt::print("{}Written: {}. Read it through, then: headwater inspect {}\n", begun.summary,
                 options->output, options->output);
    outcome.exit_code = 0;
  });
}

}  // namespace headwater::cli
