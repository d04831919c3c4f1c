// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/cli/command.hpp"

#include <headwater/base/error.hpp>
#include <headwater/base/labels.hpp>
#include <headwater/base/version.hpp>

#include <fmt/core.h>
#include <malloc.h>

#include <cstdio>
#include <exception>

int main(int argc, char** argv) {
  using namespace headwater;
  // Matrices of 10 MB come and go: keep their pages, since fresh ones cost more than the
  // arithmetic.
  mallopt(M_MMAP_THRESHOLD, 1 << 30);
  mallopt(M_TRIM_THRESHOLD, 1 << 30);

  CLI::App program("Locates the cortical generators of mismatch responses from EEG.", "headwater");
  program.set_version_flag("--version", "headwater " + version() + "\n" + caution());
  program.require_subcommand(1);
  program.footer("Start with: headwater example DIR, then headwater run DIR/experiment.toml\n\n" +
                 caution());
  cli::Outcome outcome;
  cli::add_example(program, outcome);
  cli::add_begin(program, outcome);
  cli::add_inspect(program, outcome);
  cli::add_locate(program, outcome);
  cli::add_run(program, outcome);
  cli::add_draw(program, outcome);
  cli::add_leadfield(program, outcome);
  cli::add_keys(program, outcome);
  try {
    program.parse(argc, argv);
  } catch (const CLI::RequiredError& error) {
    if (argc < 2 || argv[1][0] == '-' || !program.get_subcommands().empty()) {
      program.exit(error);
    } else {
      Labels commands;
      for (const auto* command : program.get_subcommands({}))
        commands.push_back(command->get_name());
      fmt::print(stderr, "headwater: there is no command '{}'; there are {}.{}\n", argv[1],
                 join_labels(commands), did_you_mean(argv[1], commands));
    }
    return static_cast<int>(Trouble::experiment);
  } catch (const CLI::ParseError& error) {
    const int code = program.exit(error);
    return code == 0 ? 0 : static_cast<int>(Trouble::experiment);
  } catch (const Error& error) {
    fmt::print(stderr, "headwater: {}\n", error.what());
    return static_cast<int>(error.trouble());
  } catch (const std::exception& error) {
    fmt::print(stderr, "headwater: {}\n", error.what());
    return static_cast<int>(Trouble::resource);
  }
  return outcome.exit_code;
}
