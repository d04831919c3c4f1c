// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/error.hpp>
#include <headwater/signal/trials.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <cmath>
#include <stdexcept>

namespace headwater {
namespace {

using Index = Eigen::Index;

constexpr double kUnequalCounts = 1.5;

/// Trials that a share cuts off at each end. The addend keeps 0.1 * 10 from being 0 for rounding.
std::ptrdiff_t cut_of(double trim, std::size_t count) {
  if (count == 0) return 0;
  // Below 0.5 some value is always left, in spite of the addend.
  return std::min(static_cast<std::ptrdiff_t>(trim * static_cast<double>(count) + 1e-9),
                  static_cast<std::ptrdiff_t>((count - 1) / 2));
}

void check_trim(double trim) {
  if (!(trim >= 0 && trim < 0.5))
    throw ExperimentError(
        fmt::format("A share of {} of the trials cannot be trimmed at each end: expected 0 to "
                    "below 0.5.",
                    trim));
}

std::vector<Index> members_of(const Trials& trials, std::size_t condition) {
  std::vector<Index> members;
  for (Index k = 0; k < trials.count(); ++k)
    if (trials.condition[static_cast<std::size_t>(k)] == condition) members.push_back(k);
  return members;
}

/// Mean of what is left without the `cut` smallest and largest. Reorders.
double trimmed_mean(std::vector<double>& values, std::ptrdiff_t cut) {
  const auto begin = values.begin() + cut, end = values.end() - cut;
  if (cut > 0) {
    std::nth_element(values.begin(), begin, values.end());
    std::nth_element(begin, end - 1, values.end());
  }
  double sum = 0;
  for (auto it = begin; it != end; ++it) sum += *it;
  return sum / static_cast<double>(end - begin);
}

}  // namespace

Average average_trials(const Trials& trials, std::size_t condition, double trim) {
  check_trim(trim);
  const Index count = trials.count_of(condition), samples = trials.times_s.size();
  if (count == 0) throw std::logic_error("average_trials: a condition without trials");
  const auto cut = cut_of(trim, static_cast<std::size_t>(count));
  Average average;
  average.condition = trials.conditions.at(condition);
  average.channels = trials.channels;
  average.times_s = trials.times_s;
  average.trials = static_cast<double>(count);
  const std::vector<Index> members = members_of(trials, condition);
  average.data_V = Eigen::MatrixXd::Zero(trials.data_V.rows(), samples);
  if (cut == 0) {
    for (const Index k : members) average.data_V += trials.trial(k);
    average.data_V /= average.trials;
    return average;
  }
  std::vector<double> values(members.size());
  for (Index t = 0; t < samples; ++t)
    for (Index m = 0; m < average.data_V.rows(); ++m) {
      for (std::size_t i = 0; i < members.size(); ++i)
        values[i] = trials.data_V(m, members[i] * samples + t);
      average.data_V(m, t) = trimmed_mean(values, cut);
    }
  return average;
}

Trials winsorised(const Trials& trials, double trim) {
  check_trim(trim);
  Trials result = trials;
  const Index samples = trials.times_s.size();
  for (std::size_t condition = 0; condition < trials.conditions.size(); ++condition) {
    const std::vector<Index> members = members_of(trials, condition);
    const auto cut = cut_of(trim, members.size());
    if (cut == 0) continue;
    const auto count = static_cast<double>(members.size());
    const double stretch = 1 / (1 - 2 * static_cast<double>(cut) / count);
    std::vector<double> values(members.size());
    for (Index t = 0; t < samples; ++t)
      for (Index m = 0; m < trials.data_V.rows(); ++m) {
        for (std::size_t i = 0; i < members.size(); ++i)
          values[i] = trials.data_V(m, members[i] * samples + t);
        std::sort(values.begin(), values.end());
        const double low = values[static_cast<std::size_t>(cut)];
        const double high = values[values.size() - 1 - static_cast<std::size_t>(cut)];
        double mean = 0;
        for (const double value : values) mean += std::clamp(value, low, high) / count;
        for (const Index k : members) {
          double& value = result.data_V(m, k * samples + t);
          value = mean + stretch * (std::clamp(value, low, high) - mean);
        }
      }
  }
  return result;
}

std::string count_warning(const std::vector<Average>& averages) {
  if (averages.empty()) return "";
  const auto [least, most] =
      std::minmax_element(averages.begin(), averages.end(),
                          [](const Average& a, const Average& b) { return a.trials < b.trials; });
  if (most->trials <= kUnequalCounts * least->trials) return "";
  return fmt::format(
      "{:.4g} trials of '{}' but {:.4g} of '{}': the noise of the latter is {:.0f} % larger, and "
      "peaks (largest values) of its average are biased upwards against the former's. Compare "
      "means over windows, or equal numbers of trials.",
      most->trials, most->condition, least->trials, least->condition,
      100 * (std::sqrt(most->trials / least->trials) - 1));
}

}  // namespace headwater
