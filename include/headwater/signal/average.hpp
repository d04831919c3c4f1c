// SPDX-License-Identifier: GPL-3.0-or-later
// Averaged recordings of one participant: one table for each condition.
#pragma once
#include <headwater/base/labels.hpp>
#include <headwater/base/table.hpp>
#include <headwater/signal/electrodes.hpp>

#include <Eigen/Core>

#include <filesystem>
#include <string>

namespace headwater {

/// data: #channels by #samples, V, in whatever reference it came. times: s, 0 at the stimulus.
struct Average {
  std::string condition;
  Labels channels;
  Eigen::VectorXd times_s;
  Eigen::MatrixXd data_V;
  double trials = 0;  ///< single trials in the average
};

/// Unit of the numbers in a table of averages.
enum class VoltageUnit { microvolt, millivolt, volt };
double volts_per(VoltageUnit unit);
std::string unit_name(VoltageUnit unit);  ///< "uV", "mV", "V"

/// Reads a table (`time_s` first, then channels), edits its channels, checks it. Errors
/// (InputError): those of the table; no time_s column first; times not increasing or not evenly
/// spaced (1e-3 of a step; the writer's rounding allowed); time in ms (a step above 0.5 s); every
/// channel flat; the median over channels of the peak-to-peak voltage outside 0.1 to 1000 uV (says
/// which unit would be plausible, and to set averages.unit).
Average read_average(const std::filesystem::path& path, const ChannelEdits& edits,
                     VoltageUnit unit);

/// Table participant_id, condition, trials.
class TrialCounts {
 public:
  /// The same count for every average.
  explicit TrialCounts(double trials_each) : each_(trials_each) {}
  /// Checks columns and whole numbers, all rows at once. A count of zero is legal here: it stops
  /// only the participant who needs it.
  explicit TrialCounts(Table table);
  /// Throws InputError when there is no row, more than one, or zero trials.
  double trials(std::string_view participant, std::string_view condition) const;

 private:
  double each_ = 0;
  Table table_;
};

/// Throws InputError unless the averages have the same channels (in any order: reordered to the
/// first's) and the same times; says which file differs and how.
void make_consistent(std::vector<Average>& averages, const std::vector<std::string>& sources);

/// Mean over participants of one condition's averages, over the channels common to all, in the
/// order of the first; trials is the sum. Times must agree.
Average mean_average(const std::vector<Average>& averages);

}  // namespace headwater
