// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/cli/command.hpp"

#include <headwater/app/keys.hpp>

#include <fmt/core.h>

namespace headwater::cli {

void add_keys(CLI::App& program, Outcome& outcome) {
  auto like = std::make_shared<std::string>();
  auto* command = program.add_subcommand("keys", "Every key of the experiment file");
  command->add_option("PART", *like, "Only keys whose name holds this");
  command->footer("Example: headwater keys noise");
  command->callback([like, &outcome] {
    const std::string text = keys_text(*like);
    fmt::print("{}", text);
    if (text.empty()) {
      fmt::print(stderr, "headwater: no key's name holds '{}'.\n", *like);
      outcome.exit_code = 2;
    }
  });
}

}  // namespace headwater::cli
