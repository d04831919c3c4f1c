// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/app/stages.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/parallel.hpp>
#include <headwater/base/units.hpp>

#include <fmt/core.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <cmath>
#include <new>
#include <optional>

namespace headwater {
namespace {

bool wanted(const Labels& asked, const std::string& name) {
  return asked.empty() || find_label(asked, name);
}

/// Runs body and turns an exception into the participant's failure.
template <typename Body>
std::optional<Failure> guarded(const std::string& participant, const Body& body) {
  try {
    body();
  } catch (const Error& error) {
    return Failure{participant, error.what(), error.trouble()};
  } catch (const std::bad_alloc&) {
    return Failure{participant, "out of memory: use fewer --jobs or a coarser grid.",
                   Trouble::resource};
  }
  return {};
}

void check_names(const Labels& asked, const Labels& known, const std::string& what,
                 std::string& problems) {
  for (const auto& name : asked)
    if (!find_label(known, name))
      problems += fmt::format("There is no {} '{}'; there are {}.{}\n", what, name,
                              join_labels(known), did_you_mean(name, known));
}

/// One participant through every contrast and method.
std::vector<SummaryRow> locate_one(const Experiment& experiment, const ParticipantData& participant,
                                   const ResultsFolder& results) {
  Locator locator(experiment, participant);
  std::vector<SummaryRow> rows;
  results.write_data_decisions(participant);
  for (std::size_t c = 0; c < experiment.contrasts.size(); ++c) {
    const auto windows = windows_of(experiment, experiment.contrasts[c].name);
    if (windows.empty()) continue;
    const auto& contrast = participant.contrasts[c];
    const auto dipoles = locator.dipoles(c, windows);
    results.write_waveform(participant.name, contrast, experiment.write_courses);
    if (participant.trials)
      results.write_standard_error(participant, contrast, experiment.contrasts[c].predictor);
    results.write_dipoles(participant.name, contrast, *participant.forward, dipoles);
    if (experiment.write_courses) results.write_noise(participant.name, contrast);
    for (const auto& method : experiment.methods) {
      const auto located = locator.locate(c, method, windows);
      const auto written =
          results.write_located(experiment, participant, contrast, located, dipoles);
      rows.insert(rows.end(), written.begin(), written.end());
    }
  }
  return rows;
}

}  // namespace

Experiment select(const Experiment& experiment, const StageOptions& options) {
  Experiment selected = experiment;
  Labels contrasts, people = experiment.participants;
  for (const auto& plan : experiment.contrasts) contrasts.push_back(plan.name);
  people.push_back(kMeanName);
  std::string problems;
  check_names(options.contrasts, contrasts, "contrast", problems);
  check_names(options.participants, people, "participant", problems);
  static const Labels kMethods{"minimum-norm", "sloreta", "eloreta", "lcmv"};
  check_names(options.methods, kMethods, "method", problems);
  if (!problems.empty()) {
    problems.pop_back();
    throw ExperimentError(problems);
  }
  if (!options.methods.empty()) selected.methods = options.methods;
  std::erase_if(selected.contrasts,
                [&](const ContrastPlan& plan) { return !wanted(options.contrasts, plan.name); });
  return selected;
}

InspectReport inspect(const Experiment& experiment, const StageOptions& options) {
  const TrialCounts counts = read_counts(experiment);
  ForwardModels forward_models(experiment);
  Labels people;
  const bool mean = wanted(options.participants, kMeanName);
  for (const auto& name : experiment.participants)
    if (mean || wanted(options.participants, name)) people.push_back(name);
  std::vector<std::optional<ParticipantData>> read(people.size());
  std::vector<std::optional<Failure>> failed(people.size());
  parallel_for(people.size(), options.jobs, [&](std::size_t i) {
    failed[i] = guarded(people[i], [&] {
      read[i] = load_participant(experiment, people[i], counts, forward_models);
    });
  });
  InspectReport report;
  for (std::size_t i = 0; i < people.size(); ++i) {
    if (read[i] && !failed[i]) report.participants.push_back(std::move(*read[i]));
    if (failed[i]) report.failures.push_back(*failed[i]);
  }
  return report;
}

LocateReport locate(const Experiment& experiment, const InspectReport& read,
                    const StageOptions& options) {
  LocateReport report{{}, read.failures};
  if (read.participants.empty()) return report;
  const ResultsFolder results(experiment.output);
  results.write_description(experiment.title);

  std::vector<const ParticipantData*> people;
  bool one_cap = true;
  for (const auto& participant : read.participants) {
    one_cap = one_cap && participant.forward == read.participants[0].forward;
    if (wanted(options.participants, participant.name)) people.push_back(&participant);
  }
  std::optional<ParticipantData> mean;
  if (wanted(options.participants, kMeanName)) {
    std::vector<const ParticipantData*> all;
    for (const auto& participant : read.participants) all.push_back(&participant);
    const auto failure = guarded(kMeanName, [&] {
      ForwardModels forward_models(experiment);
      mean = mean_participant(experiment, all, forward_models);
    });
    if (failure) report.failures.push_back(*failure);
    if (mean) people.push_back(&*mean);
  }
  results.write_forward(mean ? *mean->forward : *people[0]->forward, "");

  std::vector<std::vector<SummaryRow>> rows(people.size());
  std::vector<std::optional<Failure>> failed(people.size());
  parallel_for(people.size(), options.jobs, [&](std::size_t i) {
    failed[i] = guarded(people[i]->name, [&] {
      if (!one_cap) results.write_forward(*people[i]->forward, people[i]->name);
      rows[i] = locate_one(experiment, *people[i], results);
    });
    if (options.finished) options.finished(people[i]->name);
  });
  std::vector<std::string> inputs;
  for (std::size_t i = 0; i < people.size(); ++i) {
    report.rows.insert(report.rows.end(), rows[i].begin(), rows[i].end());
    if (failed[i]) report.failures.push_back(*failed[i]);
  }
  for (const auto& participant : read.participants)
    inputs.insert(inputs.end(), participant.inputs.begin(), participant.inputs.end());
  const bool selected =
      !options.participants.empty() || !options.contrasts.empty() || !options.methods.empty();
  results.write_summary(report.rows, selected);
  results.write_provenance(experiment, inputs);
  return report;
}

OutputTable inspect_table(const InspectReport& report) {
  OutputTable table{
      "What was read of each participant.",
      {{"participant_id", "Participant", ""},
       {"channels", "Channels after edits, restored reference included", ""},
       {"bad_leads", "Leads taken for bad (of averages: that look bad)", ""},
       {"samples", "Samples of an average", ""},
       {"from_ms", "First latency", "ms"},
       {"to_ms", "Last latency", "ms"},
       {"trials", "Fewest and most single trials of a condition", ""},
       {"rejected", "Events of the conditions that gave no trial", ""},
       {"noise_rank", "Rank of the noise covariance before shrinkage", ""},
       {"noise_condition", "Condition number after shrinkage", ""},
       {"shrinkage", "Weight of the scaled identity", ""},
       {"noise_uV", "Root mean square noise of a single trial", "uV"},
       {"white",
        "Mean square of the averages' whitened baseline: about 1, less where much is shrunk", ""},
       {"sphere_mm", "Radius of the sphere through the positions", "mm"},
       {"sphere_rms_mm", "Root mean square distance from it", "mm"},
       {"sphere_offset_mm", "Distance of its centre from the frame's origin", "mm"}},
      {}};
  for (const auto& participant : report.participants) {
    double fewest = participant.averages[0].trials, most = fewest;
    for (const auto& average : participant.averages) {
      fewest = std::min(fewest, average.trials);
      most = std::max(most, average.trials);
    }
    const auto& times = participant.averages[0].times_s;
    const auto& noise = participant.noise;
    const double variance =
        noise.single_trial_V2.trace() / static_cast<double>(noise.single_trial_V2.rows());
    const auto& sphere = participant.forward->sphere;
    const auto of_sphere = [&](double metres) {
      return sphere.radius > 0 ? format_fixed(metres / kMillimetre, 1) : "n/a";
    };
    const Labels bad = participant.leads.bad();
    std::string rejected = "n/a";
    if (participant.trials)
      rejected = std::to_string(
          std::count_if(participant.trials->records.begin(), participant.trials->records.end(),
                        [](const TrialRecord& record) { return !record.kept; }));
    table.rows.push_back(
        {participant.name, std::to_string(participant.averages[0].channels.size()),
         bad.empty() ? "none" : fmt::format("{}", fmt::join(bad, " ")),
         std::to_string(times.size()), format_fixed(times[0] / kMillisecond, 1),
         format_fixed(times[times.size() - 1] / kMillisecond, 1),
         fmt::format("{:.4g}-{:.4g}", fewest, most), rejected, std::to_string(noise.rank),
         format_number(noise.condition, 3), format_fixed(noise.shrinkage, 3),
         format_number(std::sqrt(variance) / kMicrovolt, 3),
         participant.whiteness.mean_square > 0 ? format_fixed(participant.whiteness.mean_square, 2)
                                               : "n/a",
         of_sphere(sphere.radius), of_sphere(sphere.rms), of_sphere(sphere.centre.norm())});
  }
  return table;
}

std::vector<LeadFinding> find_carriers(const Experiment& experiment, const InspectReport& report,
                                       const StageOptions& options) {
  Experiment quick = experiment;
  quick.methods = {"sloreta"};
  std::vector<const ParticipantData*> people;
  for (const auto& participant : report.participants) people.push_back(&participant);
  std::optional<ParticipantData> mean;
  if (people.size() > 1 && wanted(options.participants, kMeanName))
    guarded(kMeanName, [&] {
      ForwardModels forward_models(experiment);
      mean = mean_participant(experiment, people, forward_models);
    });
  if (mean) people.push_back(&*mean);
  std::vector<std::vector<LeadFinding>> found(people.size());
  parallel_for(people.size(), options.jobs, [&](std::size_t i) {
    guarded(people[i]->name, [&] {
      Locator locator(quick, *people[i]);
      for (std::size_t c = 0; c < experiment.contrasts.size(); ++c) {
        const auto windows = windows_of(experiment, experiment.contrasts[c].name);
        if (windows.empty()) continue;
        for (const auto& window : locator.locate(c, "sloreta", windows).windows)
          if (!window.influence.carriers.empty())
            found[i].push_back({people[i]->name, experiment.contrasts[c].name, window.window.name,
                                window.influence.carriers, window.influence.note});
      }
    });
  });
  std::vector<LeadFinding> all;
  for (auto& part : found) all.insert(all.end(), part.begin(), part.end());
  return all;
}

Json inspect_json(const Experiment& experiment, const InspectReport& report,
                  const std::vector<LeadFinding>& findings) {
  const OutputTable table = inspect_table(report);
  Json people = Json::array();
  for (std::size_t i = 0; i < table.rows.size(); ++i) {
    Json entry = Json::object();
    for (std::size_t k = 0; k < table.columns.size(); ++k)
      entry.set(table.columns[k].name, table.rows[i][k]);
    entry.set("notes", report.participants[i].notes);
    people.push(entry);
  }
  Json failures = Json::array();
  for (const auto& failure : report.failures) {
    Json entry = Json::object();
    entry.set("participant_id", failure.participant).set("reason", failure.reason);
    failures.push(entry);
  }
  Json carrying = Json::array();
  for (const auto& finding : findings) {
    Json entry = Json::object();
    entry.set("participant_id", finding.participant)
        .set("contrast", finding.contrast)
        .set("window", finding.window)
        .set("carriers", finding.carriers)
        .set("note", finding.note);
    carrying.push(entry);
  }
  Json contrasts = Json::array();
  for (const auto& plan : experiment.contrasts) {
    Json weights = Json::object();
    for (const auto& weight : plan.weights) weights.set(weight.condition, weight.weight);
    Json entry = Json::object();
    entry.set("name", plan.name);
    if (plan.predictor.empty())
      entry.set("weights", weights);
    else
      entry.set("predictor", plan.predictor);
    contrasts.push(entry);
  }
  Json json = Json::object();
  json.set("title", experiment.title)
      .set("participants", people)
      .set("contrasts", contrasts)
      .set("carriers", carrying)
      .set("failures", failures);
  return json;
}

}  // namespace headwater
