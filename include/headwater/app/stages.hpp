// SPDX-License-Identifier: GPL-3.0-or-later
// The stages in their order: inspect (read and check everything, estimate nothing), then locate
// (sources of every contrast for every participant, and for the mean over them). One participant's
// trouble does not stop the others. Participants run in parallel; the results do not depend on the
// number of jobs.
#pragma once
#include <headwater/app/participant.hpp>
#include <headwater/app/results_folder.hpp>
#include <headwater/base/error.hpp>

#include <functional>
#include <string>
#include <utility>
#include <vector>

namespace headwater {

struct StageOptions {
  Labels participants, contrasts,
      methods;   ///< empty: all of the experiment's ("mean" is a participant)
  int jobs = 0;  ///< 0: as many as the machine has
  std::function<void(const std::string&)>
      finished;  ///< called with each participant's name; may be empty
};

struct Failure {
  std::string participant, reason;
  Trouble trouble = Trouble::input;
};

struct InspectReport {
  std::vector<ParticipantData>
      participants;  ///< those that could be read, in the experiment's order
  std::vector<Failure> failures;
};

struct LocateReport {
  std::vector<SummaryRow> rows;
  std::vector<Failure> failures;
};

/// The experiment with only the asked-for contrasts and methods. Throws ExperimentError for unknown
/// names.
Experiment select(const Experiment& experiment, const StageOptions& options);

/// Reads every participant that is asked for (all, where the mean is wanted).
InspectReport inspect(const Experiment& experiment, const StageOptions& options);

/// Locates what was read, the mean over all participants included, and writes the results folder.
LocateReport locate(const Experiment& experiment, const InspectReport& read,
                    const StageOptions& options);

/// Who carries more than a share of a window's answer: leads, blocks of trials, participants.
struct LeadFinding {
  std::string participant, contrast, window;
  Labels carriers;
  std::string note;
};

/// By sLORETA, of every participant that was read and of their mean; nothing is written.
std::vector<LeadFinding> find_carriers(const Experiment& experiment, const InspectReport& report,
                                       const StageOptions& options);

/// What inspect found, as a table for a terminal and as JSON.
OutputTable inspect_table(const InspectReport& report);
Json inspect_json(const Experiment& experiment, const InspectReport& report,
                  const std::vector<LeadFinding>& findings);

}  // namespace headwater
