// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/participant_trials.hpp"

#include <headwater/base/error.hpp>
#include <headwater/signal/recording.hpp>
#include <headwater/signal/reference.hpp>

#include <fmt/core.h>

#include <algorithm>

namespace headwater {
namespace {

/// The values of a predictor for each event: of the observer, or a column of numbers.
Regressor regressor_of(const std::string& name, const Table& events,
                       const std::optional<ObserverRegressors>& observer) {
  if (observer && find_label(observer_regressor_names(), name))
    return {name, regressor(*observer, name)};
  const auto column = events.column(name);
  Regressor result{name, Eigen::VectorXd(static_cast<Eigen::Index>(events.rows.size()))};
  for (std::size_t row = 0; row < events.rows.size(); ++row)
    result.of_event[static_cast<Eigen::Index>(row)] =
        events.optional_number(row, column).value_or(std::numeric_limits<double>::quiet_NaN());
  return result;
}

void regress_trials(const TrialPlan& plan, const Recording& recording, const Trials& trials,
                    TrialsSummary& summary) {
  if (plan.predictors.empty()) return;
  std::optional<ObserverRegressors> observer;
  if (plan.observer) {
    observer = observe(recording.events(), *plan.observer);
    summary.prior = observer->prior;
  }
  std::vector<Regressor> regressors;
  for (const auto& name : plan.predictors)
    regressors.push_back(regressor_of(name, recording.events(), observer));
  summary.regression = regress(trials, regressors, plan.regression, plan.blocks);
  summary.predictors = std::move(regressors);
}

/// For each condition the places of its trials, block by block: consecutive, nearly equal.
std::vector<std::vector<Eigen::Index>> trials_of_blocks(const Trials& trials, std::size_t condition,
                                                        int blocks) {
  std::vector<Eigen::Index> own;
  for (Eigen::Index k = 0; k < trials.count(); ++k)
    if (trials.condition[static_cast<std::size_t>(k)] == condition) own.push_back(k);
  std::vector<std::vector<Eigen::Index>> result(static_cast<std::size_t>(blocks));
  for (std::size_t i = 0; i < own.size(); ++i)
    result[i * static_cast<std::size_t>(blocks) / own.size()].push_back(own[i]);
  return result;
}

/// Averages with each block of every condition's trials left out; of averages[k] in V.
std::vector<std::vector<Average>> averages_without_blocks(const Trials& trials,
                                                          const std::vector<Average>& averages,
                                                          int blocks) {
  std::vector<std::vector<Average>> result(static_cast<std::size_t>(blocks), averages);
  for (std::size_t c = 0; c < averages.size(); ++c) {
    const auto places = trials_of_blocks(trials, c, blocks);
    const auto total = static_cast<double>(trials.count_of(c));
    for (std::size_t b = 0; b < places.size(); ++b) {
      const auto left = static_cast<double>(places[b].size());
      if (left == 0 || left == total) continue;
      Eigen::MatrixXd sum =
          Eigen::MatrixXd::Zero(averages[c].data_V.rows(), averages[c].data_V.cols());
      for (const Eigen::Index k : places[b]) sum += trials.trial(k);
      result[b][c].data_V = (total * averages[c].data_V - sum) / (total - left);
    }
  }
  return result;
}

PartLeftOut part_of(const std::string& name, const Eigen::MatrixXd& data_V,
                    const Eigen::VectorXd& times_s, const std::vector<TimeWindow>& windows) {
  PartLeftOut part{"trials", name, {}};
  for (const auto& window : windows) {
    const auto samples = samples_in(times_s, window);
    part.windows_V.push_back(data_V.middleCols(samples.first, samples.count));
  }
  return part;
}

/// Contrasts of averages, and of regression coefficients, each with its blocks left out.
void form_contrasts(const Experiment& experiment, const Trials& trials, ParticipantData& data) {
  const int blocks = experiment.trials.blocks;
  std::vector<Average> means;  // blocks are taken out of plain means
  for (std::size_t c = 0; c < data.averages.size(); ++c)
    means.push_back(experiment.trials.trim > 0 ? average_trials(trials, c, 0) : data.averages[c]);
  const auto without = averages_without_blocks(trials, means, blocks);
  const auto& regression = data.trials->regression;
  for (const auto& plan : experiment.contrasts) {
    const auto windows = windows_of(experiment, plan.name);
    std::vector<PartLeftOut> parts;
    const auto name_of = [&](int b) { return fmt::format("block {} of {}", b + 1, blocks); };
    if (plan.predictor.empty()) {
      data.contrasts.push_back(form_contrast(plan.name, plan.weights, data.averages, data.noise));
      for (int b = 0; b < blocks; ++b)
        parts.push_back(part_of(
            name_of(b),
            form_contrast(plan.name, plan.weights, without[static_cast<std::size_t>(b)], data.noise)
                .data_V,
            trials.times_s, windows));
    } else {
      const auto place = static_cast<std::size_t>(*find_label(regression.names, plan.predictor));
      data.contrasts.push_back(
          coefficient_contrast(plan.name, regression, place, trials, data.noise));
      for (std::size_t b = 0; b < regression.without_block.size(); ++b)
        parts.push_back(part_of(name_of(static_cast<int>(b)), regression.without_block[b][place],
                                trials.times_s, windows));
    }
    data.parts.push_back(std::move(parts));
  }
}

/// Leads that the recording sets aside for another reason than their type.
std::string not_used(const Recording& recording) {
  Labels aside;
  for (const auto& channel : recording.channels())
    if (!channel.set_aside.empty() && !channel.set_aside.starts_with("type"))
      aside.push_back(fmt::format("{} ({})", channel.name, channel.set_aside));
  return aside.empty() ? "" : fmt::format("not used: {}", join_labels(aside));
}

/// The lead to which more than half of the rejected trials are owed, where they are many.
std::string costly_lead(const Trials& trials) {
  std::map<std::string, int> cost;
  int rejected = 0;
  for (const auto& record : trials.records)
    if (!record.channel.empty()) {
      ++rejected;
      ++cost[record.channel];
    }
  for (const auto& [lead, trials_lost] : cost)
    if (20 * rejected >= static_cast<int>(trials.records.size()) && 2 * trials_lost > rejected)
      return fmt::format(
          "lead {} alone is why {} of {} rejected trials went: leads.bad would keep "
          "them without it",
          lead, trials_lost, rejected);
  return "";
}

/// Conditions with so few trials that the average is mostly noise.
std::string few_trials(const std::vector<Average>& averages) {
  constexpr double kFew = 10;
  Labels few;
  for (const auto& average : averages)
    if (average.trials < kFew)
      few.push_back(fmt::format("'{}' ({:.3g})", average.condition, average.trials));
  return few.empty() ? ""
                     : fmt::format(
                           "few trials: {}. Averages of so few are mostly noise; believe only "
                           "what stays when any block is left out",
                           join_labels(few));
}

/// Is the baseline of the averages what single trials let expect? By the baseline's own covariance;
/// that in use may be of the whole epoch, and says how much larger it is.
void check_baseline(const Experiment& experiment, const Trials& trials, ParticipantData& data) {
  constexpr Eigen::Index kFewestSamples = 5;
  if (!trials.baseline_removed ||
      samples_in(trials.times_s,
                 {"baseline", trials.baseline_s.first, trials.baseline_s.second, {}})
              .count < kFewestSamples)
    return;
  NoiseOptions options;
  options.shrinkage = experiment.noise.shrinkage;
  options.oas = experiment.noise.oas;
  const NoiseCovariance baseline = estimate_trial_noise(trials, options);
  const bool of_trials = experiment.noise.from == NoiseOptions::From::trials;
  data.whiteness = check_whiteness(data.averages, of_trials ? baseline : data.noise,
                                   trials.baseline_s.first, trials.baseline_s.second);
  note_whiteness(data);
  if (of_trials)
    data.noise.source +=
        fmt::format("; {:.2f} times the variance of the baseline",
                    data.noise.single_trial_V2.trace() / baseline.single_trial_V2.trace());
}

Labels fixed_leads(const std::map<std::string, Labels>& by_participant, const std::string& name) {
  const auto found = by_participant.find(name);
  return found != by_participant.end() ? found->second : Labels{};
}

}  // namespace

void load_trials(const Experiment& experiment, ParticipantData& data) {
  const TrialPlan& plan = experiment.trials;
  const auto path = fill_pattern(plan.recording_pattern, data.name, "");
  const Recording recording(path);
  for (const auto& file : recording.files()) data.inputs.push_back(file.string());
  TrialOptions options = plan.options;
  options.leads.bad = fixed_leads(plan.bad_leads, data.name);
  options.leads.good = fixed_leads(plan.good_leads, data.name);
  const Trials trials =
      cut_trials(recording, experiment.edits, plan.choices, options,
                 [&](const Labels& labels) { return montage_of(experiment, data.cap, labels); });
  data.notes = recording.notes();
  if (const auto note = not_used(recording); !note.empty()) data.notes.push_back(note);
  data.notes.insert(data.notes.end(), trials.notes.begin(), trials.notes.end());
  data.leads = trials.leads;
  for (std::size_t c = 0; c < experiment.conditions.size(); ++c)
    data.averages.push_back(average_trials(trials, c, plan.trim));
  // Trimming lead by lead has a noise of its own, which the winsorised trials show.
  const Trials clipped = plan.trim > 0 ? winsorised(trials, plan.trim) : Trials{};
  const Trials& noisy = plan.trim > 0 ? clipped : trials;
  for (const auto& warning :
       {count_warning(data.averages), few_trials(data.averages), costly_lead(trials)})
    if (!warning.empty()) data.notes.push_back(warning);
  for (const auto& contrast : experiment.contrasts)
    for (const auto& window : windows_of(experiment, contrast.name))
      samples_in(trials.times_s, window);  // throws where there is none

  using From = NoiseOptions::From;
  data.noise =
      experiment.noise.from == From::table
          ? read_noise_table(experiment.noise.table, trials.channels, experiment.noise.shrinkage)
      : experiment.noise.from == From::trials ? estimate_trial_noise(noisy, experiment.noise)
                                              : estimate_noise(data.averages, experiment.noise);
  check_baseline(experiment, noisy, data);
  data.trials.emplace();
  data.trials->records = trials.records;
  if (experiment.lcmv_from_trials)
    data.data_covariance_V2 =
        trial_data_covariance(trials, experiment.lcmv_from_s, experiment.lcmv_to_s);
  regress_trials(plan, recording, trials, *data.trials);
  data.notes.insert(data.notes.end(), data.trials->regression.notes.begin(),
                    data.trials->regression.notes.end());
  form_contrasts(experiment, trials, data);
}

}  // namespace headwater
