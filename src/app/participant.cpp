// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/participant_trials.hpp"

#include <headwater/app/participant.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/table.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/reference.hpp>
#include <headwater/signal/spherical_spline.hpp>

#include <fmt/core.h>

#include <algorithm>

namespace headwater {

const std::vector<PartLeftOut>& ParticipantData::parts_of(std::size_t contrast) const {
  static const std::vector<PartLeftOut> none;
  return contrast < parts.size() ? parts[contrast] : none;
}

TrialCounts read_counts(const Experiment& experiment) {
  if (!experiment.counts_table) return TrialCounts(experiment.trials_each);
  return TrialCounts(read_table(*experiment.counts_table, "trial counts"));
}

namespace {

/// Takes the leads that the user calls bad out of the averages, and names those that look bad.
void judge_leads(const Experiment& experiment, ParticipantData& data) {
  const auto found = experiment.trials.bad_leads.find(data.name);
  if (found != experiment.trials.bad_leads.end()) {
    match_labels(found->second, data.averages[0].channels, "leads.bad of " + data.name);
    Labels kept;
    for (const auto& channel : data.averages[0].channels)
      if (!find_label(found->second, channel)) kept.push_back(channel);
    for (auto& average : data.averages) {
      average.data_V =
          average.data_V(match_labels(kept, average.channels, data.name), Eigen::all).eval();
      average.channels = kept;
    }
  }
  const auto& channels = data.averages[0].channels;
  const Eigen::Index samples = data.averages[0].times_s.size();
  Eigen::MatrixXd all(data.averages[0].data_V.rows(),
                      samples * static_cast<Eigen::Index>(data.averages.size()));
  for (std::size_t k = 0; k < data.averages.size(); ++k)
    all.middleCols(static_cast<Eigen::Index>(k) * samples, samples) = data.averages[k].data_V;
  data.leads = check_leads(montage_of(experiment, data.cap, channels), all,
                           static_cast<Eigen::Index>(data.averages.size()), {},
                           experiment.trials.options.leads);
  for (const auto& lead : data.leads.leads)
    if (lead.bad)
      data.notes.push_back(
          fmt::format("lead {} looks bad ({}): leads.bad = {{ {} = [\"{}\"] }} "
                      "would leave it out",
                      lead.channel, lead.reason, data.name, lead.channel));
}

void load_averages(const Experiment& experiment, const TrialCounts& counts, ParticipantData& data) {
  for (const auto& condition : experiment.conditions) {
    const auto path = fill_pattern(experiment.averages_pattern, data.name, condition.name);
    Average average = read_average(path, experiment.edits, experiment.unit);
    average.condition = condition.name;
    average.trials = counts.trials(data.name, condition.name);
    data.averages.push_back(std::move(average));
    data.inputs.push_back(path.string());
  }
  make_consistent(data.averages, data.inputs);
  for (const auto& plan : experiment.contrasts)
    for (const auto& window : windows_of(experiment, plan.name))
      samples_in(data.averages[0].times_s, window);  // throws where there is none
  judge_leads(experiment, data);
  const Labels& channels = data.averages[0].channels;
  data.noise = experiment.noise.from == NoiseOptions::From::table
                   ? read_noise_table(experiment.noise.table, channels, experiment.noise.shrinkage)
                   : estimate_noise(data.averages, experiment.noise);
  for (const auto& plan : experiment.contrasts)
    data.contrasts.push_back(form_contrast(plan.name, plan.weights, data.averages, data.noise));
}

}  // namespace

void note_whiteness(ParticipantData& data) {
  if (data.whiteness.white) return;
  data.notes.push_back(fmt::format(
      "the whitened baseline of the averages has mean square {:.2f}, expected {:.2f} to {:.2f}: {}",
      data.whiteness.mean_square, data.whiteness.low, data.whiteness.high,
      data.whiteness.mean_square > data.whiteness.high
          ? "their noise is larger than the covariance says (locked to the events, or trials that "
            "are not independent)"
          : "their noise is smaller than the covariance says"));
}

namespace {

/// Does the noise fit the averages' baseline? Where there is one. (Trials have been checked.)
void check_noise(const Experiment& experiment, ParticipantData& data) {
  if (data.trials) return;
  std::pair<double, double> baseline{experiment.noise.baseline_from_s,
                                     experiment.noise.baseline_to_s};
  if (baseline.first >= baseline.second) baseline = {-1e9, -1e-9};
  const auto& times = data.averages[0].times_s;
  const auto inside = (times.array() >= baseline.first && times.array() <= baseline.second).count();
  if (inside < 5) return;
  data.whiteness = check_whiteness(data.averages, data.noise, baseline.first, baseline.second);
  note_whiteness(data);
}

}  // namespace

ParticipantData load_participant(const Experiment& experiment, const std::string& participant,
                                 const TrialCounts& counts, ForwardModels& forward_models) {
  ParticipantData data;
  data.name = participant;
  data.cap = read_participant_cap(experiment, participant);
  if (experiment.has_trials())
    load_trials(experiment, data);
  else
    load_averages(experiment, counts, data);
  if (experiment.positions != "standard") data.inputs.push_back(data.cap.source);
  data.notes.insert(data.notes.begin(), data.cap.notes.begin(), data.cap.notes.end());
  check_noise(experiment, data);
  data.forward = forward_models.of(montage_of(experiment, data.cap, data.averages[0].channels),
                                   data.cap.sphere);
  return data;
}

namespace {

/// Throws InputError that names everyone whose samples differ from the first participant's.
void check_same_times(const std::vector<const ParticipantData*>& participants) {
  const Eigen::VectorXd& first = participants[0]->averages[0].times_s;
  const double step = (first[first.size() - 1] - first[0]) / static_cast<double>(first.size() - 1);
  Labels others;
  for (const auto* participant : participants) {
    const Eigen::VectorXd& times = participant->averages[0].times_s;
    if (times.size() != first.size() || (times - first).cwiseAbs().maxCoeff() > 1e-3 * step)
      others.push_back(participant->name);
  }
  if (!others.empty())
    throw InputError(fmt::format(
        "there is no mean over participants: the samples of {} differ from those of {} ({} from "
        "{:g} to {:g} ms). Cut the averages alike, or leave out participants.",
        join_labels(others), participants[0]->name, first.size(), first[0] / kMillisecond,
        first[first.size() - 1] / kMillisecond));
}

}  // namespace

namespace {

/// The mean contrast without each participant in turn: from the mean and the one left out.
std::vector<PartLeftOut> without_each(const std::vector<ContrastWaveform>& contrasts,
                                      const Labels& names, const ContrastWaveform& mean,
                                      const std::vector<TimeWindow>& windows) {
  std::vector<PartLeftOut> parts;
  const double people = static_cast<double>(contrasts.size());
  if (contrasts.size() < 3) return parts;  // what is left must still be a mean
  for (std::size_t s = 0; s < contrasts.size(); ++s) {
    const auto rows = match_labels(mean.channels, contrasts[s].channels, names[s]);
    const Eigen::MatrixXd own =
        average_reference(mean.data_V.rows()) * contrasts[s].data_V(rows, Eigen::all);
    const Eigen::MatrixXd rest = (people * mean.data_V - own) / (people - 1);
    PartLeftOut part{"participant", names[s], {}};
    for (const auto& window : windows) {
      const auto samples = samples_in(mean.times_s, window);
      part.windows_V.push_back(rest.middleCols(samples.first, samples.count));
    }
    parts.push_back(std::move(part));
  }
  return parts;
}

}  // namespace

namespace {

/// Leads that more than half of the participants have, in the order of their first appearance.
Labels common_leads(const std::vector<const ParticipantData*>& participants) {
  Labels all;
  for (const auto* participant : participants)
    for (const auto& channel : participant->averages[0].channels)
      if (!find_label(all, channel)) all.push_back(channel);
  std::erase_if(all, [&](const std::string& channel) {
    const auto having = std::count_if(
        participants.begin(), participants.end(), [&](const ParticipantData* participant) {
          return find_label(participant->averages[0].channels, channel).has_value();
        });
    return 2 * static_cast<std::size_t>(having) <= participants.size();
  });
  return all;
}

/// Each lead at its mean position over the participants that have it.
Montage mean_montage(const std::vector<const ParticipantData*>& participants,
                     const Labels& channels) {
  Montage mean{channels, Eigen::Matrix3Xd::Zero(3, static_cast<Eigen::Index>(channels.size()))};
  for (std::size_t i = 0; i < channels.size(); ++i) {
    Eigen::Vector3d sum = Eigen::Vector3d::Zero();
    double having = 0;
    for (const auto* participant : participants)
      if (const auto place = find_label(participant->forward->montage.labels, channels[i])) {
        sum += participant->forward->montage.positions.col(*place);
        ++having;
      }
    mean.positions.col(static_cast<Eigen::Index>(i)) = sum / having;
  }
  return mean;
}

/// What one participant gives to the mean, at the mean's leads.
struct Contribution {
  std::vector<Average> averages;
  std::vector<ContrastWaveform> contrasts;
  NoiseCovariance noise;
  Eigen::MatrixXd data_covariance_V2;
};

/// Map from a participant's leads to the mean's: its own where it has them, else interpolated.
Eigen::MatrixXd lead_map(const ParticipantData& participant, const Montage& target) {
  const Montage& own = participant.forward->montage;
  Eigen::MatrixXd map = spline_interpolation(own.positions, target.positions);
  for (std::size_t i = 0; i < target.labels.size(); ++i)
    if (const auto place = find_label(own.labels, target.labels[i])) {
      const auto row = static_cast<Eigen::Index>(i);
      map.row(row).setZero();
      map(row, *place) = 1;
    }
  return map;
}

Contribution contribution_of(const ParticipantData& participant, const Montage& target) {
  Contribution result{participant.averages, participant.contrasts, participant.noise,
                      participant.data_covariance_V2};
  if (participant.averages[0].channels == target.labels) return result;
  const Eigen::MatrixXd map = lead_map(participant, target);
  // y = B'd of the participant becomes B'map B y: rows of the map sum to 1, so that references
  // agree.
  const Eigen::MatrixXd subspace_map =
      reference_free_basis(map.rows()).transpose() * map * reference_free_basis(map.cols());
  const auto mapped = [&](const Eigen::MatrixXd& covariance) -> Eigen::MatrixXd {
    return subspace_map * covariance * subspace_map.transpose();
  };
  for (auto& average : result.averages) {
    average.data_V = map * average.data_V;
    average.channels = target.labels;
  }
  for (auto& contrast : result.contrasts) {
    contrast.data_V = average_reference(map.rows()) * (map * contrast.data_V);
    contrast.noise_V2 = mapped(contrast.noise_V2);
    contrast.channels = target.labels;
  }
  result.noise.single_trial_V2 = mapped(result.noise.single_trial_V2);
  result.noise.channels = target.labels;
  if (result.data_covariance_V2.size() > 0)
    result.data_covariance_V2 = mapped(result.data_covariance_V2);
  return result;
}

}  // namespace

ParticipantData mean_participant(const Experiment& experiment,
                                 const std::vector<const ParticipantData*>& participants,
                                 ForwardModels& forward_models) {
  ParticipantData mean;
  mean.name = kMeanName;
  check_same_times(participants);
  const bool one_cap = std::all_of(
      participants.begin(), participants.end(),
      [&](const ParticipantData* other) { return other->forward == participants[0]->forward; });
  const Montage montage = one_cap ? participants[0]->forward->montage
                                  : mean_montage(participants, common_leads(participants));
  const auto people = static_cast<double>(participants.size());
  std::vector<Contribution> parts;
  std::vector<NoiseCovariance> noise;
  Labels names;
  SphereFit sphere = participants[0]->forward->sphere;
  sphere.radius = 0;
  for (const auto* participant : participants) {
    parts.push_back(contribution_of(*participant, montage));
    noise.push_back(parts.back().noise);
    names.push_back(participant->name);
    sphere.radius += participant->forward->sphere.radius / people;
  }
  for (std::size_t k = 0; k < experiment.conditions.size(); ++k) {
    std::vector<Average> averages;
    averages.reserve(parts.size());
    for (const auto& part : parts) averages.push_back(part.averages[k]);
    mean.averages.push_back(mean_average(averages));
  }
  for (std::size_t k = 0; k < experiment.contrasts.size(); ++k) {
    std::vector<ContrastWaveform> contrasts;
    contrasts.reserve(parts.size());
    for (const auto& part : parts) contrasts.push_back(part.contrasts[k]);
    mean.contrasts.push_back(mean_contrast(contrasts, noise));
    mean.parts.push_back(without_each(contrasts, names, mean.contrasts.back(),
                                      windows_of(experiment, experiment.contrasts[k].name)));
  }
  if (parts[0].data_covariance_V2.size() > 0) {
    mean.data_covariance_V2 = parts[0].data_covariance_V2 / people;
    for (std::size_t s = 1; s < parts.size(); ++s)
      mean.data_covariance_V2 += parts[s].data_covariance_V2 / people;
  }
  // One cap stays the same to the last bit, so that its lead field is shared.
  mean.forward = one_cap ? participants[0]->forward : forward_models.of(montage, sphere);
  return mean;
}

}  // namespace headwater
