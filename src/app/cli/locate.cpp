// SPDX-License-Identifier: GPL-3.0-or-later
#include <fmt/core.h>
#include <unistd.h>

#include <headwater/base/progress.hpp>
#include <headwater/base/units.hpp>

#include "app/cli/command.hpp"

namespace headwater::cli {
namespace {

/// What the mean over participants (or the only one) says, window by window.
void print_summary(const std::vector<SummaryRow>& rows, const std::string& participant) {
  std::string at, pair;
  for (const auto& row : rows) {
    if (row.participant != participant) continue;
    const std::string where = row.contrast + ", " + row.window;
    if (where != at) {
      fmt::print("\n{} ({})\n", where, participant);
      at = where;
      pair.clear();
    }
    if (row.kind == "mirrored pair") {
      if (!pair.empty()) continue;  // the same for every method
      pair = row.note;
      fmt::print("  mirrored pair  ({:.0f}, {:.0f}, {:.0f}) mm and its mirror image, {}: {}\n",
                 row.mni_m.x() / kMillimetre, row.mni_m.y() / kMillimetre, row.mni_m.z() / kMillimetre,
                 row.gyrus, row.note);
    } else {
      fmt::print("  {:<13}  ({:.0f}, {:.0f}, {:.0f}) mm, {} {}, {:.0f} ms{}{}\n", row.method,
                 row.mni_m.x() / kMillimetre, row.mni_m.y() / kMillimetre, row.mni_m.z() / kMillimetre,
                 row.side, row.gyrus, row.latency_s / kMillisecond, row.note.empty() ? "" : " - ",
                 row.note);
      fmt::print("  {:<13}  strongest regions: {}\n", "", row.strongest_regions);
    }
  }
}

}  // namespace

int locate_and_print(const ExperimentOptions& options, bool show_inspection) {
  const Experiment experiment = read_selected(options);
  StageOptions stages = stage_options(options);
  const InspectReport read = inspect(experiment, stages);
  const bool talk = !options.quiet && !options.json;
  if (talk && show_inspection && !read.participants.empty())
    fmt::print("{}", aligned(inspect_table(read)));
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
    print_summary(report.rows, report.rows.back().participant);
    fmt::print("\nAll participants: {}\n", (experiment.output / "summary.tsv").string());
  }
  return report_failures(report.failures, !report.rows.empty());
}

void add_locate(CLI::App& program, Outcome& outcome) {
  auto options = std::make_shared<ExperimentOptions>();
  auto* command =
      program.add_subcommand("locate", "Sources of every contrast, for every participant and their mean");
  add_experiment_options(*command, *options);
  command->footer("Example: headwater locate experiment.toml --participant mean --method sloreta");
  command->callback([options, &outcome] { outcome.exit_code = locate_and_print(*options, false); });
}

}  // namespace headwater::cli
