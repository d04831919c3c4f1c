// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/cli/command.hpp"

#include <headwater/app/figures.hpp>
#include <headwater/base/progress.hpp>

#include <fmt/core.h>

namespace headwater::cli {

void add_draw(CLI::App& program, Outcome&) {
  auto options = std::make_shared<ExperimentOptions>();
  auto* command = program.add_subcommand(
      "draw",
      "Pictures of located sources, without a display (by default of the mean over participants)");
  add_experiment_options(*command, *options);
  command->footer("Example: headwater draw experiment.toml --method sloreta");
  command->callback([options] {
    const Experiment experiment = read_selected(*options);
    StageOptions stages = stage_options(*options);
    const std::size_t people = std::max<std::size_t>(1, stages.participants.size());
    std::size_t pictures = 0;
    for (const auto& plan : experiment.contrasts)
      pictures += people * experiment.methods.size() * windows_of(experiment, plan.name).size();
    std::vector<std::filesystem::path> files;
    {
      Progress progress(options->quiet ? nullptr : stderr, pictures, "draw");
      stages.finished = [&](const std::string& name) { progress.advance(name); };
      files = draw_figures(experiment, stages);
    }
    Json list = Json::array();
    for (const auto& file : files) list.push(file.filename().string());
    if (options->json)
      fmt::print("{}\n", Json::object().set("figures", list).dump());
    else if (!options->quiet)
      for (const auto& file : files) fmt::print("{}\n", file.string());
  });
}

}  // namespace headwater::cli
