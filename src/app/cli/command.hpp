// SPDX-License-Identifier: GPL-3.0-or-later
// What every command shares: options that mean the same everywhere, how results and messages are
// printed, and the exit code.
#pragma once
#include <headwater/app/stages.hpp>

#include <CLI/CLI.hpp>

#include <string>
#include <vector>

namespace headwater::cli {

/// Set by a command's callback; main returns it.
struct Outcome {
  int exit_code = 0;
};

/// Options of the commands that read an experiment file.
struct ExperimentOptions {
  std::string file;
  std::vector<std::string> participants, contrasts, methods;
  std::string output;
  int jobs = 0;
  long long seed = -1;
  bool quiet = false, verbose = false, json = false;
};

void add_experiment_options(CLI::App& command, ExperimentOptions& options);

/// The experiment with --output, --seed, --contrast and --method applied.
Experiment read_selected(const ExperimentOptions& options);
StageOptions stage_options(const ExperimentOptions& options);

/// Prints failures to standard error; 0, or 4 when some participants failed, or the trouble of the
/// first when all did.
int report_failures(const std::vector<Failure>& failures, bool any_done);

/// Columns aligned for a terminal.
std::string aligned(const OutputTable& table);

/// Adds the command to the program; `outcome` receives its exit code.
void add_example(CLI::App& program, Outcome& outcome);
void add_begin(CLI::App& program, Outcome& outcome);
void add_inspect(CLI::App& program, Outcome& outcome);
void add_locate(CLI::App& program, Outcome& outcome);
void add_run(CLI::App& program, Outcome& outcome);
void add_draw(CLI::App& program, Outcome& outcome);
void add_leadfield(CLI::App& program, Outcome& outcome);
void add_keys(CLI::App& program, Outcome& outcome);

/// Shared by locate and run: reads, locates, prints.
int locate_and_print(const ExperimentOptions& options, bool show_inspection);

}  // namespace headwater::cli
