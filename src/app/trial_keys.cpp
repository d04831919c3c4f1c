// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/trial_keys.hpp"

#include <headwater/base/error.hpp>
#include <headwater/base/units.hpp>

#include <fmt/core.h>

#include <utility>

namespace headwater {
namespace {

std::map<std::string, std::string> text_map(const TomlValue* value) {
  std::map<std::string, std::string> result;
  if (value && value->is_table())
    for (const auto& [name, text] : std::get<TomlValue::Table>(value->value))
      if (text.is_text()) result[name] = std::get<std::string>(text.value);
  return result;
}

std::map<std::string, Labels> list_map(const TomlValue* value) {
  std::map<std::string, Labels> result;
  if (value && value->is_table())
    for (const auto& [name, list] : std::get<TomlValue::Table>(value->value))
      result[name] = texts_of(*value, name);
  return result;
}

/// Two latencies in order, s; empty where the key is absent or wrong (which is reported).
std::optional<std::pair<double, double>> window_of(KeyReader& keys, const std::string& key) {
  if (!keys.has(key)) return {};
  const auto ends = keys.numbers(key);
  if (ends.size() != 2 || ends[0] >= ends[1]) {
    keys.problem(keys.find(key), fmt::format("'{}' needs two numbers, the smaller first.", key));
    return {};
  }
  return std::pair{ends[0] * kMillisecond, ends[1] * kMillisecond};
}

TrialOptions trial_options(KeyReader& keys) {
  TrialOptions options;
  options.from_s = keys.number("trials.from_ms") * kMillisecond;
  options.to_s = keys.number("trials.to_ms") * kMillisecond;
  if (keys.has("trials.to_ms") && options.from_s >= options.to_s)
    keys.problem(keys.find("trials.to_ms"), "'trials.to_ms' must lie after 'trials.from_ms'.");
  options.baseline_s = window_of(keys, "trials.baseline_ms");
  if (options.baseline_s && (options.baseline_s->first < options.from_s - 1e-9 ||
                             options.baseline_s->second > options.to_s + 1e-9))
    keys.problem(keys.find("trials.baseline_ms"),
                 "'trials.baseline_ms' must lie within trials.from_ms and trials.to_ms.");
  if (keys.has("trials.drift_degree"))
    options.drift_degree = static_cast<int>(keys.number("trials.drift_degree"));
  options.high_pass_Hz = keys.number("trials.high_pass_Hz");
  options.low_pass_Hz = keys.number("trials.low_pass_Hz");
  options.filter_order = static_cast<int>(keys.number("trials.filter_order"));
  if (options.filter_order % 2 != 0)
    keys.problem(keys.find("trials.filter_order"),
                 "'trials.filter_order' must be even: half of it goes each way.");
  if (options.high_pass_Hz > 0 && options.low_pass_Hz > 0 &&
      options.high_pass_Hz >= options.low_pass_Hz)
    keys.problem(keys.find("trials.low_pass_Hz"),
                 "'trials.low_pass_Hz' must lie above 'trials.high_pass_Hz'.");
  options.decimate = static_cast<int>(keys.number("trials.decimate"));
  if (options.decimate > 1 && options.low_pass_Hz == 0)
    keys.problem(keys.find("trials.decimate"),
                 "'trials.decimate' needs 'trials.low_pass_Hz', at most a third of the new rate: "
                 "else what is above half that rate would fold into the signal.");
  options.reject_V = keys.number("trials.reject_uV") * kMicrovolt;
  options.flat_V = keys.number("trials.flat_uV") * kMicrovolt;
  options.step_V = keys.number("trials.step_uV") * kMicrovolt;
  return options;
}

BadLeadOptions lead_options(KeyReader& keys) {
  BadLeadOptions options;
  options.find = keys.flag("leads.find_bad");
  options.interpolate = fold_case(keys.text("leads.bad_are")) == "interpolated";
  options.deviation_limit = keys.number("leads.deviation_limit");
  options.correlation_limit = keys.number("leads.correlation_limit");
  options.spline_limit = keys.number("leads.spline_limit");
  options.marked_limit = keys.number("leads.marked_limit");
  return options;
}

ObserverOptions observer_options(KeyReader& keys) {
  ObserverOptions options;
  options.value_column = keys.text("observer.value");
  options.block_columns = keys.texts("observer.blocks");
  options.forgetting = keys.number("observer.forgetting");
  if (keys.has("observer.prior_mean")) options.prior_mean = keys.number("observer.prior_mean");
  if (keys.has("observer.prior_sd")) {
    options.prior_sd = keys.number("observer.prior_sd");
    if (!(*options.prior_sd > 0))
      keys.problem(keys.find("observer.prior_sd"), "'observer.prior_sd' must be above 0.");
  }
  options.prior_weight = keys.number("observer.prior_weight");
  options.prior_shape = keys.number("observer.prior_shape");
  options.logarithm = keys.flag("observer.logarithm");
  return options;
}

void read_choices(KeyReader& keys, Experiment& experiment) {
  for (const auto* entry : keys.entries("conditions")) {
    EventChoice choice{text_of(*entry, "name"), text_map(entry->find("events"))};
    if (choice.where.empty()) choice.where[keys.text("trials.event_column")] = choice.condition;
    for (const auto& other : experiment.trials.choices)
      if (other.where == choice.where)
        keys.problem(entry, fmt::format("conditions '{}' and '{}' ask for the same events.",
                                        other.condition, choice.condition));
    experiment.trials.choices.push_back(std::move(choice));
  }
}

void read_regression(KeyReader& keys, Experiment& experiment) {
  TrialPlan& plan = experiment.trials;
  plan.predictors = keys.texts("regression.predictors");
  plan.regression.conditions = keys.texts("regression.conditions");
  plan.regression.within_conditions = keys.flag("regression.within_conditions");
  Labels conditions;
  for (const auto& condition : experiment.conditions) conditions.push_back(condition.name);
  for (const auto& name : plan.regression.conditions)
    if (!find_label(conditions, name))
      keys.problem(keys.find("regression.conditions"),
                   fmt::format("'regression.conditions' names '{}', which is not one of "
                               "[[conditions]].{}",
                               name, did_you_mean(name, conditions)));
  for (const auto& repeated : repeated_labels(plan.predictors))
    keys.problem(keys.find("regression.predictors"),
                 fmt::format("predictor '{}' is there twice.", repeated));
  for (const auto& name : plan.predictors)
    if (find_label(observer_regressor_names(), name) && !plan.observer)
      keys.problem(keys.find("regression.predictors"),
                   fmt::format("predictor '{}' is the ideal observer's: give [observer] with the "
                               "column of the stimulus values.",
                               name));
}

}  // namespace

void read_trial_keys(KeyReader& keys, Experiment& experiment, const std::filesystem::path& folder) {
  const bool trials = keys.has("trials"), averages = keys.has("averages");
  if (trials == averages)
    keys.problem(keys.find(trials ? "trials" : ""),
                 trials ? "there are both [averages] and [trials]: give one."
                        : "there is neither [averages] (tables of averages) nor [trials] "
                          "(recordings): give one.");
  TrialPlan& plan = experiment.trials;
  plan.bad_leads = list_map(keys.find("leads.bad"));
  plan.good_leads = list_map(keys.find("leads.good"));
  plan.options.leads = lead_options(keys);
  if (!trials) {
    for (const char* section : {"observer", "regression"})
      if (const auto* value = keys.find(section))
        keys.problem(value, fmt::format("[{}] needs single trials: give [trials].", section));
    return;
  }
  const std::string pattern = keys.text("trials.recording");
  if (!pattern.empty()) {
    plan.recording_pattern = (folder / pattern).lexically_normal().string();
    if (pattern.find("{participant}") == std::string::npos)
      keys.problem(keys.find("trials.recording"),
                   "'trials.recording' lacks {participant}: the name of each file must say it.");
  }
  const BadLeadOptions leads = plan.options.leads;
  plan.options = trial_options(keys);
  plan.options.leads = leads;
  plan.trim = fold_case(keys.text("trials.average")) == "trimmed" ? keys.number("trials.trim") : 0;
  plan.blocks = static_cast<int>(keys.number("trials.blocks"));
  if (plan.blocks == 1)
    keys.problem(keys.find("trials.blocks"), "'trials.blocks' is 1: expected 0 (none) or 2 to 50.");
  if (keys.has("observer")) plan.observer = observer_options(keys);
  read_choices(keys, experiment);
  if (keys.has("regression")) read_regression(keys, experiment);
}

}  // namespace headwater
