// SPDX-License-Identifier: GPL-3.0-or-later
#include "problems.hpp"

#include <headwater/base/error.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/average.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <stdexcept>

namespace headwater {
namespace {

constexpr std::array<VoltageUnit, 3> kUnits{VoltageUnit::microvolt, VoltageUnit::millivolt,
                                            VoltageUnit::volt};
constexpr double kSmallest_V = 0.1 * kMicrovolt, kLargest_V = 1000 * kMicrovolt;
constexpr double kTimeTolerance = 1e-3;  // of a step

double mean_step(const Eigen::VectorXd& times_s) {
  return (times_s[times_s.size() - 1] - times_s[0]) / static_cast<double>(times_s.size() - 1);
}

/// Unit in the last place that the writer of the times used (1e-3 for 0.002, 0.004), from the
/// numbers.
double written_digit(const Eigen::VectorXd& times_s) {
  double digit = 1;
  for (int decimals = 0; decimals < 9; ++decimals, digit /= 10)
    if (((times_s / digit).array() - (times_s / digit).array().round()).abs().maxCoeff() < 1e-6)
      break;
  return digit;
}

void check_times(const Eigen::VectorXd& times_s, const std::string& source) {
  const auto refuse = [&](const std::string& text) {
    throw InputError(source + ": column time_s: " + text);
  };
  if (times_s.size() < 2) refuse("one sample only, at least 2 are needed.");
  for (Eigen::Index i = 1; i < times_s.size(); ++i)
    if (!(times_s[i] > times_s[i - 1]))
      refuse(fmt::format("times do not increase: {} s in row {} after {} s.", times_s[i], i + 1,
                         times_s[i - 1]));
  const double step = mean_step(times_s);
  if (step > 0.5)
    refuse(fmt::format("steps of {:.4g} s: these look like ms. Divide the times by 1000.", step));
  // First, last and present sample are each rounded by half a digit. The allowance stays below half
  // a step, so that a missing sample is always seen.
  const double allowed = kTimeTolerance * step + std::min(written_digit(times_s), 0.4 * step);
  for (Eigen::Index i = 0; i < times_s.size(); ++i) {
    const double expected = times_s[0] + step * static_cast<double>(i);
    if (std::abs(times_s[i] - expected) > allowed)
      refuse(fmt::format(
          "not evenly spaced: {} s in row {}, expected {:.6g} s (step {:.6g} s). Is a sample "
          "missing, or one there twice?",
          times_s[i], i + 1, expected, step));
  }
}

double median(std::vector<double> values) {
  const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
  std::nth_element(values.begin(), middle, values.end());
  return *middle;
}

/// The unit that brings the peak-to-peak value nearest to 10 uV, if any makes it plausible.
std::string unit_advice(double as_written) {
  std::string best;
  double nearest = 1e300;
  for (const VoltageUnit unit : kUnits) {
    const double volts = as_written * volts_per(unit);
    const double distance = std::abs(std::log10(volts / (10 * kMicrovolt)));
    if (volts < kSmallest_V || volts > kLargest_V || distance >= nearest) continue;
    nearest = distance;
    best = fmt::format("In {} they would be plausible ({:.3g} uV): set averages.unit = \"{}\".",
                       unit_name(unit), volts / kMicrovolt, unit_name(unit));
  }
  return best.empty() ? "No unit (uV, mV, V) makes them plausible: check the table." : best;
}

/// Numbers as written, #channels by #samples without restored zeros: are they voltages of averages?
void check_voltages(const Eigen::MatrixXd& as_written, VoltageUnit unit,
                    const std::string& source) {
  const Eigen::VectorXd range = as_written.rowwise().maxCoeff() - as_written.rowwise().minCoeff();
  if (range.maxCoeff() == 0)
    throw InputError(source + ": every channel is flat: there is no signal in this table.");
  const double typical = median({range.data(), range.data() + range.size()});
  const double volts = typical * volts_per(unit);
  if (volts >= kSmallest_V && volts <= kLargest_V) return;
  throw InputError(fmt::format(
      "{}: read in {}, the voltages have a median peak-to-peak of {:.3g} uV over channels, "
      "expected "
      "0.1 to 1000 uV. {}",
      source, unit_name(unit), volts / kMicrovolt,
      typical > 0 ? unit_advice(typical) : "More than half of the channels are flat: drop them."));
}

/// How the channels of `other` differ from those of `first`, as text for a message; empty when not.
std::string channel_difference(const Labels& first, const Labels& other) {
  const auto lacking = [](const Labels& wanted, const Labels& there) {
    Labels result;
    for (const std::string& name : wanted)
      if (!find_label_any_case(there, name)) result.push_back(name);
    return result;
  };
  std::string text;
  if (const Labels missing = lacking(first, other); !missing.empty())
    text += " lacks " + join_labels(missing);
  if (const Labels extra = lacking(other, first); !extra.empty())
    text += (text.empty() ? " has in addition " : " and has in addition ") + join_labels(extra);
  return text;
}

/// How the times differ, as text for a message; empty when not. Channels are not compared.
std::string time_difference(const Eigen::VectorXd& first, const Eigen::VectorXd& other) {
  const bool same = first.size() == other.size() &&
                    (first.size() < 2 || (first - other).cwiseAbs().maxCoeff() <=
                                             kTimeTolerance * std::abs(mean_step(first)));
  if (same) return {};
  const auto span = [](const Eigen::VectorXd& times) {
    return times.size() == 0 ? std::string("no samples")
                             : fmt::format("{} samples from {} to {} s", times.size(), times[0],
                                           times[times.size() - 1]);
  };
  return fmt::format(" has {}, expected {}", span(other), span(first));
}

Eigen::MatrixXd rows_for(const Average& average, const Labels& channels) {
  Eigen::MatrixXd data(static_cast<Eigen::Index>(channels.size()), average.data_V.cols());
  for (std::size_t i = 0; i < channels.size(); ++i)
    data.row(static_cast<Eigen::Index>(i)) =
        average.data_V.row(*find_label_any_case(average.channels, channels[i]));
  return data;
}

}  // namespace

double volts_per(VoltageUnit unit) {
  return unit == VoltageUnit::microvolt   ? kMicrovolt
         : unit == VoltageUnit::millivolt ? kMillivolt
                                          : 1.0;
}

std::string unit_name(VoltageUnit unit) {
  return unit == VoltageUnit::microvolt ? "uV" : unit == VoltageUnit::millivolt ? "mV" : "V";
}

Average read_average(const std::filesystem::path& path, const ChannelEdits& edits,
                     VoltageUnit unit) {
  const NumberTable table = read_number_table(path, "table of averages");
  if (table.columns.empty() || table.columns.front() != "time_s")
    throw InputError(
        fmt::format("{}: the first column must be time_s (times in seconds), found {}.",
                    table.source, join_labels(table.columns)));
  Average average;
  average.times_s = table.values.col(0);
  check_times(average.times_s, table.source);
  const ChannelPlan plan =
      plan_channels({table.columns.begin() + 1, table.columns.end()}, edits, table.source);
  average.channels = plan.labels;
  const auto channels = static_cast<Eigen::Index>(plan.labels.size());
  const Eigen::Index restored = std::count(plan.source.begin(), plan.source.end(), -1);
  average.data_V = Eigen::MatrixXd::Zero(channels, table.values.rows());
  for (Eigen::Index i = 0; i < channels; ++i)
    if (const Eigen::Index column = plan.source[static_cast<std::size_t>(i)]; column >= 0)
      average.data_V.row(i) = table.values.col(column + 1).transpose();
  check_voltages(average.data_V.topRows(channels - restored), unit, table.source);
  average.data_V *= volts_per(unit);
  return average;
}

TrialCounts::TrialCounts(Table table) : table_(std::move(table)) {
  table_.column("participant_id");
  table_.column("condition");
  const std::size_t trials = table_.column("trials");
  std::vector<std::string> problems;
  for (std::size_t row = 0; row < table_.rows.size(); ++row) {
    double count = -1;
    try {
      count = table_.number(row, trials);
    } catch (const InputError&) {
      // reported with the rest below
    }
    if (count < 0 || count != std::floor(count))
      problems.push_back(fmt::format("line {}, column trials: found '{}', expected a whole number.",
                                     table_.lines[row], table_.rows[row][trials]));
  }
  if (!problems.empty()) throw InputError(problem_list(table_.source, problems));
}

double TrialCounts::trials(std::string_view participant, std::string_view condition) const {
  const bool same_for_all = table_.columns.empty();
  const std::string source = same_for_all ? "Trial counts" : table_.source;
  double found = each_;
  int rows = same_for_all ? 1 : 0;
  if (!same_for_all) {
    const std::size_t who = table_.column("participant_id"), what = table_.column("condition");
    for (std::size_t row = 0; row < table_.rows.size(); ++row) {
      if (table_.rows[row][who] != participant || table_.rows[row][what] != condition) continue;
      found = table_.number(row, table_.column("trials"));
      ++rows;
    }
  }
  const std::string pair = fmt::format("participant '{}', condition '{}'", participant, condition);
  if (rows != 1)
    throw InputError(fmt::format("{}: {} for {}, expected one.", source,
                                 rows == 0 ? std::string("no row") : fmt::format("{} rows", rows),
                                 pair));
  if (!(found > 0))
    throw InputError(fmt::format(
        "{}: {} trials for {}: an average needs at least one. Leave out the participant or the "
        "condition.",
        source, found, pair));
  return found;
}

void make_consistent(std::vector<Average>& averages, const std::vector<std::string>& sources) {
  if (averages.size() != sources.size())
    throw std::logic_error("make_consistent: one source for each average");
  if (averages.empty()) return;
  const Average& first = averages.front();
  std::vector<std::string> problems;
  for (std::size_t i = 1; i < averages.size(); ++i)
    for (const std::string& difference : {channel_difference(first.channels, averages[i].channels),
                                          time_difference(first.times_s, averages[i].times_s)})
      if (!difference.empty()) problems.push_back(sources[i] + difference + ".");
  if (!problems.empty())
    throw InputError(problem_list("Averages differ from " + sources.front(), problems));
  for (std::size_t i = 1; i < averages.size(); ++i) {
    averages[i].data_V = rows_for(averages[i], first.channels);
    averages[i].channels = first.channels;
    averages[i].times_s = first.times_s;
  }
}

Average mean_average(const std::vector<Average>& averages) {
  if (averages.empty()) throw InputError("Mean over participants: there is no average.");
  Average mean;
  mean.condition = averages.front().condition;
  mean.times_s = averages.front().times_s;
  for (const std::string& name : averages.front().channels)
    if (std::all_of(averages.begin(), averages.end(), [&](const Average& average) {
          return find_label_any_case(average.channels, name).has_value();
        }))
      mean.channels.push_back(name);
  if (mean.channels.empty())
    throw InputError(fmt::format(
        "Mean over participants, condition '{}': no channel is common to all.", mean.condition));
  mean.data_V =
      Eigen::MatrixXd::Zero(static_cast<Eigen::Index>(mean.channels.size()), mean.times_s.size());
  for (std::size_t i = 0; i < averages.size(); ++i) {
    const std::string difference = time_difference(mean.times_s, averages[i].times_s);
    if (!difference.empty())
      throw InputError(
          fmt::format("Mean over participants, condition '{}': participant {} of {}{}.",
                      mean.condition, i + 1, averages.size(), difference));
    mean.data_V += rows_for(averages[i], mean.channels) / static_cast<double>(averages.size());
    mean.trials += averages[i].trials;
  }
  return mean;
}

}  // namespace headwater
