// SPDX-License-Identifier: GPL-3.0-or-later
#include "noise_parts.hpp"
#include "problems.hpp"

#include <headwater/base/error.hpp>
#include <headwater/signal/contrast.hpp>
#include <headwater/signal/reference.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <cmath>
#include <optional>
#include <stdexcept>

namespace headwater {
namespace {

/// Bit f of a cell is set for the second level of factor f; nothing for a condition outside the
/// effect.
std::optional<std::size_t> cell_of(const Condition& condition,
                                   const std::vector<EffectFactor>& effect) {
  std::size_t cell = 0;
  for (std::size_t f = 0; f < effect.size(); ++f) {
    const auto level = condition.factors.find(effect[f].factor);
    if (level == condition.factors.end()) return std::nullopt;
    if (level->second == effect[f].second)
      cell |= std::size_t{1} << f;
    else if (level->second != effect[f].first)
      return std::nullopt;
  }
  return cell;
}

std::string cell_name(std::size_t cell, const std::vector<EffectFactor>& effect) {
  std::string name;
  for (std::size_t f = 0; f < effect.size(); ++f)
    name += fmt::format("{}{} = {}", f ? ", " : "", effect[f].factor,
                        cell >> f & 1 ? effect[f].second : effect[f].first);
  return name;
}

/// Factors and levels that no condition has, and factors given twice.
std::vector<std::string> effect_problems(const std::vector<Condition>& conditions,
                                         const std::vector<EffectFactor>& effect) {
  std::vector<std::string> problems;
  if (effect.empty()) problems.push_back("no factor is given.");
  Labels factors;
  std::map<std::string, Labels> levels;
  for (const Condition& condition : conditions)
    for (const auto& [factor, level] : condition.factors) {
      if (!find_label(factors, factor)) factors.push_back(factor);
      if (!find_label(levels[factor], level)) levels[factor].push_back(level);
    }
  Labels seen;
  for (const EffectFactor& part : effect) {
    if (find_label(seen, part.factor))
      problems.push_back(fmt::format("factor '{}' is given twice.", part.factor));
    seen.push_back(part.factor);
    if (!find_label(factors, part.factor)) {
      problems.push_back(fmt::format("no condition has a factor '{}'.{}", part.factor,
                                     did_you_mean(part.factor, factors)));
      continue;
    }
    for (const std::string& level : {part.first, part.second})
      if (!find_label(levels[part.factor], level))
        problems.push_back(fmt::format("factor '{}' has no level '{}', but {}.{}", part.factor,
                                       level, join_labels(levels[part.factor]),
                                       did_you_mean(level, levels[part.factor])));
    if (part.first == part.second)
      problems.push_back(
          fmt::format("factor '{}': level '{}' minus itself is nothing.", part.factor, part.first));
  }
  return problems;
}

bool same_times(const Eigen::VectorXd& a, const Eigen::VectorXd& b) {
  if (a.size() != b.size()) return false;
  if (a.size() < 2) return true;
  const double step = (a[a.size() - 1] - a[0]) / static_cast<double>(a.size() - 1);
  return (a - b).cwiseAbs().maxCoeff() <= 1e-3 * std::abs(step);
}

/// In the order and the spelling of the first.
Labels common_channels(const std::vector<ContrastWaveform>& contrasts) {
  Labels common;
  for (const std::string& channel : contrasts.front().channels)
    if (std::all_of(contrasts.begin(), contrasts.end(), [&](const ContrastWaveform& contrast) {
          return find_label_any_case(contrast.channels, channel).has_value();
        }))
      common.push_back(channel);
  return common;
}

}  // namespace

std::vector<ConditionWeight> effect_weights(const std::vector<Condition>& conditions,
                                            const std::vector<EffectFactor>& effect) {
  std::vector<std::string> problems = effect_problems(conditions, effect);
  if (!problems.empty()) throw ExperimentError(problem_list("Effect", problems));
  std::vector<int> members(std::size_t{1} << effect.size(), 0);
  for (const Condition& condition : conditions)
    if (const auto cell = cell_of(condition, effect)) ++members[*cell];
  for (std::size_t cell = 0; cell < members.size(); ++cell)
    if (members[cell] == 0)
      problems.push_back(fmt::format("no condition has {}.", cell_name(cell, effect)));
  if (!problems.empty()) throw ExperimentError(problem_list("Effect", problems));
  std::vector<ConditionWeight> weights;
  for (const Condition& condition : conditions) {
    const auto cell = cell_of(condition, effect);
    if (!cell) continue;
    double sign = 1;
    for (std::size_t f = 0; f < effect.size(); ++f)
      if (*cell >> f & 1) sign = -sign;
    weights.push_back({condition.name, sign / members[*cell]});
  }
  return weights;
}

ContrastWaveform form_contrast(const std::string& name, const std::vector<ConditionWeight>& weights,
                               const std::vector<Average>& averages, const NoiseCovariance& noise) {
  const std::string where = "Contrast '" + name + "'";
  if (averages.empty()) throw InputError(where + ": there is no average.");
  const Average& first = averages.front();
  Eigen::MatrixXd sum = Eigen::MatrixXd::Zero(first.data_V.rows(), first.data_V.cols());
  std::map<std::string, double> merged;  // a condition named twice is one average, not two
  for (const ConditionWeight& part : weights) merged[part.condition] += part.weight;
  double variance = 0;  // in units of a single trial's: sum_k w_k^2 / n_k
  std::vector<std::string> problems;
  for (const auto& [condition, weight] : merged) {
    if (weight == 0) continue;
    const auto average =
        std::find_if(averages.begin(), averages.end(),
                     [&name = condition](const Average& a) { return a.condition == name; });
    if (average == averages.end()) {
      problems.push_back(fmt::format("there is no average of condition '{}'.", condition));
    } else if (average->channels != first.channels || average->data_V.cols() != sum.cols()) {
      problems.push_back(
          fmt::format("the average of condition '{}' has other channels or samples "
                      "than that of '{}'.",
                      condition, first.condition));
    } else if (!(average->trials > 0)) {
      problems.push_back(
          fmt::format("the average of condition '{}' has {} trials.", condition, average->trials));
    } else {
      sum += weight * average->data_V;
      variance += weight * weight / average->trials;
    }
  }
  if (!problems.empty()) throw InputError(problem_list(where, problems));
  if (!(variance > 0)) throw ExperimentError(where + ": every weight is 0.");
  ContrastWaveform contrast;
  contrast.name = name;
  contrast.channels = first.channels;
  contrast.times_s = first.times_s;
  contrast.data_V = average_reference(sum.rows()) * sum;
  contrast.effective_trials = 1 / variance;
  contrast.noise_V2 = covariance_of(noise, first.channels) * variance;
  return contrast;
}

ContrastWaveform mean_contrast(const std::vector<ContrastWaveform>& contrasts,
                               const std::vector<NoiseCovariance>& noise_of) {
  if (contrasts.empty()) throw InputError("Mean contrast: there is no participant.");
  if (contrasts.size() != noise_of.size())
    throw std::logic_error("mean_contrast: one noise covariance for each participant");
  ContrastWaveform mean;
  mean.name = contrasts.front().name;
  mean.times_s = contrasts.front().times_s;
  mean.channels = common_channels(contrasts);
  if (mean.channels.size() < 2)
    throw InputError(fmt::format("Contrast '{}': the participants have {} channels in common.",
                                 mean.name, mean.channels.size()));
  const auto count = static_cast<Eigen::Index>(mean.channels.size());
  const auto participants = static_cast<double>(contrasts.size());
  mean.data_V = Eigen::MatrixXd::Zero(count, mean.times_s.size());
  mean.noise_V2 = Eigen::MatrixXd::Zero(count - 1, count - 1);
  double single_trial = 0;
  for (std::size_t s = 0; s < contrasts.size(); ++s) {
    const ContrastWaveform& one = contrasts[s];
    if (!same_times(one.times_s, mean.times_s))
      throw InputError(fmt::format("Contrast '{}': participant {} of {} has other times.",
                                   mean.name, s + 1, contrasts.size()));
    Labels own;  // the common channels in this participant's spelling
    for (Eigen::Index i = 0; i < count; ++i) {
      const auto row =
          *find_label_any_case(one.channels, mean.channels[static_cast<std::size_t>(i)]);
      own.push_back(one.channels[static_cast<std::size_t>(row)]);
      mean.data_V.row(i) += one.data_V.row(row) / participants;
    }
    const Eigen::MatrixXd trial = covariance_of(noise_of[s], own);
    single_trial += trial.trace() / participants;
    mean.noise_V2 += trial / (one.effective_trials * participants * participants);
  }
  mean.data_V.rowwise() -= mean.data_V.colwise().mean().eval();  // fewer channels: average anew
  mean.effective_trials = single_trial / mean.noise_V2.trace();
  return mean;
}

}  // namespace headwater
