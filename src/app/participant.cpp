// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/app/participant.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/table.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/reference.hpp>

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

ParticipantData load_participant(const Experiment& experiment, const std::string& participant,
                                 const TrialCounts& counts, ForwardModels& forward_models) {
  ParticipantData data;
  data.name = participant;
  for (const auto& condition : experiment.conditions) {
    const auto path = fill_pattern(experiment.averages_pattern, participant, condition.name);
    Average average = read_average(path, experiment.edits, experiment.unit);
    average.condition = condition.name;
    average.trials = counts.trials(participant, condition.name);
    data.averages.push_back(std::move(average));
    data.inputs.push_back(path.string());
  }
  make_consistent(data.averages, data.inputs);
  for (const auto& plan : experiment.contrasts)
    for (const auto& window : windows_of(experiment, plan.name))
      samples_in(data.averages[0].times_s, window);  // throws where there is none
  const Labels& channels = data.averages[0].channels;
  data.noise = experiment.noise.from == NoiseOptions::From::table
                   ? read_noise_table(experiment.noise.table, channels, experiment.noise.shrinkage)
                   : estimate_noise(data.averages, experiment.noise);
  for (const auto& plan : experiment.contrasts)
    data.contrasts.push_back(form_contrast(plan.name, plan.weights, data.averages, data.noise));
  data.forward = forward_models.of(participant, channels);
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

ParticipantData mean_participant(const Experiment& experiment,
                                 const std::vector<const ParticipantData*>& participants,
                                 ForwardModels& forward_models) {
  ParticipantData mean;
  mean.name = kMeanName;
  check_same_times(participants);
  for (std::size_t k = 0; k < experiment.conditions.size(); ++k) {
    std::vector<Average> averages;
    averages.reserve(participants.size());
    for (const auto* participant : participants) averages.push_back(participant->averages[k]);
    mean.averages.push_back(mean_average(averages));
  }
  std::vector<NoiseCovariance> noise;
  noise.reserve(participants.size());
  Labels names;
  for (const auto* participant : participants) {
    noise.push_back(participant->noise);
    names.push_back(participant->name);
  }
  for (std::size_t k = 0; k < experiment.contrasts.size(); ++k) {
    std::vector<ContrastWaveform> contrasts;
    contrasts.reserve(participants.size());
    for (const auto* participant : participants) contrasts.push_back(participant->contrasts[k]);
    mean.contrasts.push_back(mean_contrast(contrasts, noise));
    mean.parts.push_back(without_each(contrasts, names, mean.contrasts.back(),
                                      windows_of(experiment, experiment.contrasts[k].name)));
  }
  const Labels& channels = mean.averages[0].channels;
  Montage montage{channels, Eigen::Matrix3Xd::Zero(3, static_cast<Eigen::Index>(channels.size()))};
  SphereFit sphere = participants[0]->forward->sphere;
  double radius = 0;
  for (const auto* participant : participants) {
    const Montage own =
        select_positions(participant->forward->montage, channels, participant->name);
    montage.positions += own.positions / static_cast<double>(participants.size());
    radius += participant->forward->sphere.radius / static_cast<double>(participants.size());
  }
  // Identical caps stay identical to the last bit, so that their lead field is shared.
  if (participants[0]->forward->montage.labels == channels) {
    const bool same = std::all_of(participants.begin(), participants.end(), [&](const auto* other) {
      return other->forward == participants[0]->forward;
    });
    if (same) {
      mean.forward = participants[0]->forward;
      return mean;
    }
  }
  sphere.radius = radius;
  mean.forward = forward_models.of(montage, sphere);
  return mean;
}

}  // namespace headwater
