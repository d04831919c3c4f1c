// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/cli/command.hpp"

#include <headwater/app/example.hpp>

#include <fmt/core.h>

namespace headwater::cli {

void add_example(CLI::App& program, Outcome&) {
  struct Options {
    std::string folder;
    std::uint64_t seed = 1;
    bool quiet = false;
  };
  auto options = std::make_shared<Options>();
  auto* command = program.add_subcommand(
      "example", "Write the invented example experiment (synthetic participants, known sources)");
  command->add_option("DIR", options->folder, "New or empty folder")->required();
  command->add_option("--seed", options->seed, "Seed of the invented data");
  command->add_flag("--quiet", options->quiet, "Print nothing");
  command->footer(
      "Example: headwater example late-beats && headwater run late-beats/experiment.toml");
  command->callback([options] {
    write_example(options->folder, options->seed);
    if (!options->quiet)
      fmt::print(
          "Written: {0}\nNext: headwater run {0}/experiment.toml\nSingle trials: headwater run "
          "{0}/recordings.toml\n",
          options->folder);
  });
}

}  // namespace headwater::cli
