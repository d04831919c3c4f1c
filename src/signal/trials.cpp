// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/chosen_events.hpp"
#include "signal/epochs.hpp"
#include "signal/problems.hpp"
#include "signal/trial_limits.hpp"

#include <headwater/base/error.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/spherical_spline.hpp>
#include <headwater/signal/trials.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <map>

namespace headwater {
namespace {

using Index = Eigen::Index;
using Indices = std::vector<Index>;

constexpr std::size_t kFewestLeads = 8;
constexpr Index kFewestSamples = 8;    // that a lead can be judged by
constexpr double kJitterShown = 0.01;  // of a sample

/// The names that the recording does not set aside already.
Labels without_set_aside(const Labels& names, const Recording& recording) {
  Labels left;
  for (const std::string& name : names) {
    const auto& all = recording.channels();
    const bool aside = std::any_of(all.begin(), all.end(), [&](const RecordingChannel& channel) {
      return !channel.set_aside.empty() && fold_case(channel.name) == fold_case(name);
    });
    const bool used = find_label_any_case(recording.used_names(), name).has_value();
    if (used || !aside) left.push_back(name);
  }
  return left;
}

/// Leads of the analysis; the source of each is its place among the recording's channels.
ChannelPlan plan_leads(const Recording& recording, ChannelEdits edits) {
  edits.drop = without_set_aside(edits.drop, recording);
  Labels names;
  Indices places;
  for (std::size_t i = 0; i < recording.channels().size(); ++i) {
    if (!recording.channels()[i].set_aside.empty()) continue;
    names.push_back(recording.channels()[i].name);
    places.push_back(static_cast<Index>(i));
  }
  ChannelPlan plan = plan_channels(names, edits, recording.source());
  for (Index& source : plan.source)
    if (source >= 0) source = places[static_cast<std::size_t>(source)];
  return plan;
}

/// What a reader should know of where the epochs lie.
void note_places(const std::vector<PlacedEpoch>& placed, const EpochGrid& grid,
                 const Recording& recording, const TrialOptions& options, Labels& notes) {
  double jitter_s = 0;
  Index shortest = std::numeric_limits<Index>::max();
  int overlapping = 0;
  for (std::size_t e = 0; e < placed.size(); ++e) {
    jitter_s = std::max(jitter_s, std::abs(placed[e].jitter_s));
    shortest = std::min(shortest, recording.segments()[placed[e].segment].count);
    if (e > 0 && *placed[e].sample < *placed[e - 1].sample + grid.count) ++overlapping;
  }
  const double rate = recording.sampling_Hz();
  if (overlapping > 0)
    notes.push_back(fmt::format(
        "{} of {} epochs overlap the one before: they share samples and are not independent.",
        overlapping, placed.size()));
  if (jitter_s * rate > kJitterShown)
    notes.push_back(
        fmt::format("Events lie up to {:.2g} ms from the sample that is taken for theirs (one "
                    "sample: {:.4g} ms).",
                    jitter_s / kMillisecond, 1 / rate / kMillisecond));
  if (options.high_pass_Hz > 0 && static_cast<double>(shortest) / rate < 1 / options.high_pass_Hz)
    notes.push_back(fmt::format(
        "The shortest gap-free piece lasts {:.3g} s, less than a period of the high-pass of {:g} "
        "Hz: the filter cannot settle there; a drift polynomial suits such pieces better.",
        static_cast<double>(shortest) / rate, options.high_pass_Hz));
}

/// Records of all chosen events; those without an epoch have their reason.
std::vector<TrialRecord> make_records(const std::vector<ChosenEvent>& events,
                                      const std::vector<PlacedEpoch>& placed,
                                      const Labels& conditions) {
  std::vector<TrialRecord> records;
  for (std::size_t e = 0; e < events.size(); ++e) {
    TrialRecord record;
    record.event_row = events[e].row;
    record.onset_s = events[e].onset_s;
    record.condition = conditions[events[e].place];
    record.kept = placed[e].sample.has_value();
    record.reason = placed[e].reason;
    record.figure = std::numeric_limits<double>::quiet_NaN();
    records.push_back(record);
  }
  return records;
}

/// Throws when a condition has no trial left.
void check_left(const std::vector<TrialRecord>& records, const Labels& conditions,
                const std::string& where) {
  std::vector<std::string> problems;
  for (const std::string& condition : conditions) {
    std::map<std::string, int> reasons, leads;
    bool left = false;
    for (const TrialRecord& record : records) {
      if (record.condition != condition) continue;
      left |= record.kept;
      if (!record.kept) ++reasons[record.reason];
      if (!record.channel.empty()) ++leads[record.channel];
    }
    if (left) continue;
    Labels why;
    for (const auto& [reason, count] : reasons)
      why.push_back(fmt::format("{} x {}", count, reason));
    std::string problem =
        fmt::format("condition '{}' has no trial left: {}.", condition, join_labels(why));
    const auto worst =
        std::max_element(leads.begin(), leads.end(),
                         [](const auto& x, const auto& y) { return x.second < y.second; });
    if (worst != leads.end())
      problem += fmt::format(
          " Most often at {} ({} x): compare trials.reject_uV, trials.high_pass_Hz and leads.bad.",
          worst->first, worst->second);
    problems.push_back(problem);
  }
  if (!problems.empty()) throw InputError(problem_list(where, problems));
}

/// Rejects, and returns the trials that stay. records: of the trials, in their order.
Indices reject_trials(const Eigen::MatrixXd& data, Index samples, const Indices& good,
                      const std::vector<bool>& restored, const Labels& labels,
                      const TrialOptions& options, const std::vector<TrialRecord*>& records) {
  Indices stay;
  for (Index k = 0; k < static_cast<Index>(records.size()); ++k) {
    const BrokenLimit broken =
        broken_limit(data.middleCols(k * samples, samples), good, restored, options);
    if (broken.lead < 0) {
      stay.push_back(k);
      continue;
    }
    TrialRecord& record = *records[static_cast<std::size_t>(k)];
    record.kept = false;
    record.reason = broken.reason;
    record.channel = labels[static_cast<std::size_t>(broken.lead)];
    record.figure = broken.figure;
  }
  return stay;
}

/// Good leads only, or all of them with the bad ones interpolated; the trials that stay.
void take(const Eigen::MatrixXd& data, const Montage& montage, const Indices& good,
          const Indices& bad, bool interpolate, const Indices& stay, Trials& trials) {
  const Index samples = trials.times_s.size();
  const bool all = interpolate || bad.empty();
  Eigen::MatrixXd weights;
  if (interpolate && !bad.empty())
    weights = spline_interpolation(montage.positions(Eigen::all, good),
                                   montage.positions(Eigen::all, bad));
  const Index rows = all ? data.rows() : static_cast<Index>(good.size());
  trials.data_V.resize(rows, samples * static_cast<Index>(stay.size()));
  for (std::size_t k = 0; k < stay.size(); ++k) {
    const auto from = data.middleCols(stay[k] * samples, samples);
    auto to = trials.data_V.middleCols(static_cast<Index>(k) * samples, samples);
    if (all)
      to = from;
    else
      to = from(good, Eigen::all);
    if (weights.size() > 0) to(bad, Eigen::all) = weights * from(good, Eigen::all);
  }
  if (all)
    trials.channels = montage.labels;
  else
    for (const Index lead : good)
      trials.channels.push_back(montage.labels[static_cast<std::size_t>(lead)]);
}

/// Refuses epochs that would not fit a common machine, before anything is read.
void check_size(std::size_t leads, Index samples, std::size_t epochs, const std::string& where) {
  constexpr double kMostBytes = 8e9;     // twice the epochs are held
  constexpr Index kMostSamples = 20000;  // noise compares samples by samples
  const double bytes = 16.0 * static_cast<double>(leads) * static_cast<double>(samples) *
                       static_cast<double>(epochs);
  if (bytes <= kMostBytes && samples <= kMostSamples) return;
  throw InputError(fmt::format(
      "{}: {} epochs of {} samples at {} leads need {:.0f} GB; at most {:.0f} GB and {} samples in "
      "an epoch are worked on. Shorten the epochs (trials.from_ms, trials.to_ms), or decimate.",
      where, epochs, samples, leads, std::ceil(bytes / 1e9), kMostBytes / 1e9, kMostSamples));
}

void split_leads(const LeadCheck& check, const std::string& where, Indices& good, Indices& bad) {
  for (std::size_t i = 0; i < check.leads.size(); ++i)
    (check.leads[i].bad ? bad : good).push_back(static_cast<Index>(i));
  if (good.size() < kFewestLeads)
    throw InputError(fmt::format("{}: {} good leads left, at least {} are needed; bad: {}.", where,
                                 good.size(), kFewestLeads, join_labels(check.bad())));
}

}  // namespace

Index Trials::count_of(std::size_t place) const {
  return std::count(condition.begin(), condition.end(), place);
}

Trials cut_trials(const Recording& recording, const ChannelEdits& edits,
                  const std::vector<EventChoice>& choices, const TrialOptions& options,
                  const MontageOf& montage_of) {
  const ChannelPlan plan = plan_leads(recording, edits);
  const EpochGrid grid = make_grid(recording, options);
  const std::vector<ChosenEvent> events =
      choose_events(recording.events(), choices, recording.source());
  Trials trials;
  trials.times_s = grid.times_s;
  trials.baseline_removed = options.baseline_s.has_value();
  if (options.baseline_s) trials.baseline_s = *options.baseline_s;
  for (const EventChoice& choice : choices) trials.conditions.push_back(choice.condition);

  const std::vector<PlacedEpoch> places = place_epochs(recording, grid, events);
  trials.records = make_records(events, places, trials.conditions);
  check_left(trials.records, trials.conditions, recording.source());
  std::vector<PlacedEpoch> placed;
  std::vector<std::size_t> event_of;
  std::vector<TrialRecord*> records;
  for (std::size_t e = 0; e < places.size(); ++e) {
    if (!places[e].sample) continue;
    placed.push_back(places[e]);
    event_of.push_back(e);
    records.push_back(&trials.records[e]);
  }
  note_places(placed, grid, recording, options, trials.notes);

  check_size(plan.labels.size(), grid.kept(), placed.size(), recording.source());
  const Montage montage = montage_of(plan.labels);
  const Eigen::MatrixXd data = read_epochs(recording, plan.source, grid, placed, options);
  std::vector<bool> restored;
  for (const Index source : plan.source) restored.push_back(source < 0);
  BadLeadOptions lead_options = options.leads;
  lead_options.bad = without_set_aside(lead_options.bad, recording);
  if (grid.kept() < kFewestSamples && lead_options.find) {
    lead_options.find = false;
    trials.notes.push_back(fmt::format(
        "Epochs of {} samples are too short to judge leads by: none was called bad.", grid.kept()));
  }
  trials.leads = check_leads(montage, data, static_cast<Index>(placed.size()),
                             mark_limits(data, grid.kept(), restored, options), lead_options);
  Indices good, bad;
  split_leads(trials.leads, recording.source(), good, bad);
  const Indices stay =
      reject_trials(data, grid.kept(), good, restored, plan.labels, options, records);
  check_left(trials.records, trials.conditions, recording.source());
  take(data, montage, good, bad, options.leads.interpolate, stay, trials);
  for (const Index k : stay) {
    const ChosenEvent& event = events[event_of[static_cast<std::size_t>(k)]];
    trials.condition.push_back(event.place);
    trials.event_row.push_back(event.row);
  }
  return trials;
}

}  // namespace headwater
