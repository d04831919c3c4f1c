// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/cli/command.hpp"

#include <headwater/base/progress.hpp>
#include <headwater/base/units.hpp>

#include <fmt/core.h>

#include <algorithm>

namespace headwater::cli {
namespace {

std::string place_text(const SummaryRow& row) {
  return fmt::format("({:.0f}, {:.0f}, {:.0f}) mm", row.mni_m.x() / kMillimetre,
                     row.mni_m.y() / kMillimetre, row.mni_m.z() / kMillimetre);
}

/// One contrast and window of one participant: the pair once, then each method's peak and regions.
void print_window(const std::vector<const SummaryRow*>& rows, const std::string& whom) {
  fmt::print("\n{}, {} ({})\n", rows[0]->contrast, rows[0]->window, whom);
  bool pair_printed = false;
  for (const auto* row : rows) {
    if (row->kind == "mirrored pair") {
      if (!pair_printed)  // the same for every method
        fmt::print("  mirrored pair  {} and its mirror image, {}: {}\n", place_text(*row),
                   row->gyrus, row->note);
      pair_printed = true;
      continue;
    }
    fmt::print("  {:<13}  {}, {} {}, {:.0f} ms{}{}\n  {:<13}  strongest regions: {}\n", row->method,
               place_text(*row), row->side, row->gyrus, row->latency_s / kMillisecond,
               row->note.empty() ? "" : " - ", row->note, "", row->strongest_regions);
  }
}

/// What the last participant (the mean where there is one) says, window by window.
void print_summary(const std::vector<SummaryRow>& rows, std::size_t read, std::size_t failed) {
  const std::string& last = rows.back().participant;
  const std::string whom = last != kMeanName ? last
                           : failed == 0     ? "mean"
                                             : fmt::format("mean of {} of {}", read, read + failed);
  std::vector<std::pair<std::string, std::vector<const SummaryRow*>>> windows;
  for (const auto& row : rows) {
    if (row.participant != rows.back().participant) continue;
    const std::string key = fmt::format("{}\t{}", row.contrast, row.window);
    if (auto found = std::find_if(windows.begin(), windows.end(),
                                  [&](const auto& entry) { return entry.first == key; });
        found != windows.end())
      found->second.push_back(&row);
    else
      windows.push_back({key, {&row}});
  }
  for (const auto& [key, members] : windows) print_window(members, whom);
}

}  // namespace

int locate_and_print(const ExperimentOptions& options, bool show_inspection) {
  const Experiment experiment = read_selected(options);
  StageOptions stages = stage_options(options);
  const InspectReport read = inspect(experiment, stages);
  const bool talk = !options.quiet && !options.json;
  if (talk && show_inspection && !read.participants.empty())
    fmt::print("{} of {} participants read (`headwater inspect` shows each).\n",
               read.participants.size(), read.participants.size() + read.failures.size());
  if (options.verbose)
    for (const auto& participant : read.participants)
      fmt::print(stderr, "{}: {}\n", participant.name, participant.noise.source);
  const auto& asked = options.participants;
  std::size_t count = asked.empty() ? read.participants.size() + 1 : asked.size();
  LocateReport report;
  {
    Progress progress(options.quiet ? nullptr : stderr, count, "locate");
    stages.finished = [&](const std::string& name) { progress.advance(name); };
    report = locate(experiment, read, stages);
  }
  if (options.json) {
    Json failures = Json::array();
    for (const auto& failure : report.failures) {
      Json entry = Json::object();
      entry.set("participant_id", failure.participant).set("reason", failure.reason);
      failures.push(entry);
    }
    Json json = Json::object();
    json.set("output", experiment.output.filename().string())
        .set("sources", summary_json(report.rows))
        .set("failures", failures);
    fmt::print("{}\n", json.dump());
  } else if (talk && !report.rows.empty()) {
    print_summary(report.rows, read.participants.size(), read.failures.size());
    fmt::print("\nAll participants: {}\n", (experiment.output / "summary.tsv").string());
  }
  return report_failures(report.failures, !report.rows.empty());
}

void add_locate(CLI::App& program, Outcome& outcome) {
  auto options = std::make_shared<ExperimentOptions>();
  auto* command = program.add_subcommand(
      "locate", "Sources of every contrast, for every participant and their mean");
  add_experiment_options(*command, *options);
  command->footer("Example: headwater locate experiment.toml --participant mean --method sloreta");
  command->callback([options, &outcome] { outcome.exit_code = locate_and_print(*options, false); });
}

}  // namespace headwater::cli
