// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/influence.hpp"

#include <headwater/app/located.hpp>
#include <headwater/base/error.hpp>
#include <headwater/inverse/eloreta.hpp>
#include <headwater/inverse/estimate.hpp>
#include <headwater/inverse/lcmv.hpp>
#include <headwater/inverse/minimum_norm.hpp>
#include <headwater/inverse/sloreta.hpp>
#include <headwater/signal/noise_covariance.hpp>

#include <fmt/core.h>

#include <limits>
#include <optional>
#include <set>

namespace headwater {
namespace {

/// Columns of the samples that lie in any of the windows.
Eigen::MatrixXd window_samples(const ContrastWaveform& contrast,
                               const std::vector<TimeWindow>& windows) {
  std::set<Eigen::Index> samples;
  for (const auto& window : windows) {
    const auto range = samples_in(contrast.times_s, window);
    for (Eigen::Index t = 0; t < range.count; ++t) samples.insert(range.first + t);
  }
  Eigen::MatrixXd data(contrast.data_V.rows(), static_cast<Eigen::Index>(samples.size()));
  Eigen::Index column = 0;
  for (const Eigen::Index t : samples) data.col(column++) = contrast.data_V.col(t);
  return data;
}

RegularisationChoice choose(const GramSpectrum& spectrum, const Subspace& subspace,
                            const Eigen::MatrixXd& data_V, double scale,
                            const RegularisationRule& rule) {
  const Eigen::MatrixXd z = spectrum_map(subspace, spectrum) * data_V / std::sqrt(scale);
  return choose_regularisation(spectrum.values / scale, z, rule);
}

}  // namespace

/// The factorisations for one noise covariance, each made on first use.
struct Locator::Engine {
  Subspace subspace;
  std::unique_ptr<MinimumNorm> minimum_norm;
  std::unique_ptr<Sloreta> sloreta;
  std::unique_ptr<Eloreta> eloreta;
  std::unique_ptr<Lcmv> lcmv;
  std::unique_ptr<DipoleScan> scan;

  /// Spectrum for the fit, empty for LCMV.
  std::optional<GramSpectrum> estimate(const Experiment& experiment,
                                       const ParticipantData& participant,
                                       const std::string& method, const Eigen::MatrixXd& data_V,
                                       double scale, LocatedContrast& located);
};

std::optional<GramSpectrum> Locator::Engine::estimate(const Experiment& experiment,
                                                      const ParticipantData& participant,
                                                      const std::string& method,
                                                      const Eigen::MatrixXd& data_V, double scale,
                                                      LocatedContrast& located) {
  const auto& rule = experiment.regularisation;
  auto& choice = located.regularisation;
  if (method == "minimum-norm") {
    if (!minimum_norm)
      minimum_norm = std::make_unique<MinimumNorm>(subspace, experiment.depth_exponent);
    choice = choose(minimum_norm->spectrum(), subspace, data_V, scale, rule);
    located.inverse = minimum_norm->at(choice.used, scale);
    return minimum_norm->spectrum();
  }
  if (method == "sloreta") {
    if (!sloreta) sloreta = std::make_unique<Sloreta>(subspace);
    choice = choose(sloreta->spectrum(), subspace, data_V, scale, rule);
    located.inverse = sloreta->at(choice.used, scale);
    return sloreta->spectrum();
  }
  if (method == "eloreta") {
    eloreta = std::make_unique<Eloreta>(subspace);
    eloreta->adapt(choose(eloreta->spectrum(), subspace, data_V, scale, rule).used, scale);
    choice = choose(eloreta->spectrum(), subspace, data_V, scale, rule);
    located.inverse = eloreta->at(choice.used, scale);
    located.iterations = eloreta->iterations();
    located.converged = eloreta->converged();
    return eloreta->spectrum();
  }
  if (!lcmv) {
    const Eigen::MatrixXd covariance =
        experiment.lcmv_table
            ? read_noise_table(*experiment.lcmv_table, subspace.channels, 0.0).single_trial_V2
        : participant.data_covariance_V2.size() > 0
            ? participant.data_covariance_V2
            : pooled_data_covariance(participant.averages, experiment.lcmv_from_s,
                                     experiment.lcmv_to_s);
    lcmv = std::make_unique<Lcmv>(subspace, covariance, participant.forward->outward,
                                  participant.forward->grid.mirror, experiment.lcmv);
  }
  located.inverse = lcmv->at(scale);
  constexpr double kNone = std::numeric_limits<double>::quiet_NaN();
  choice.used = choice.gcv = choice.l_curve = choice.snr3 = choice.effective_parameters = kNone;
  choice.rule = fmt::format("data covariance plus {:g} of its mean eigenvalue",
                            experiment.lcmv.regularisation);
  return {};
}

Locator::Locator(const Experiment& experiment, const ParticipantData& participant)
    : experiment_(&experiment), participant_(&participant) {}

Locator::~Locator() = default;

Locator::Engine& Locator::engine_for(const ContrastWaveform& contrast) {
  for (auto& engine : engines_)
    if (noise_scale(engine->subspace, contrast.noise_V2) > 0) return *engine;
  engines_.push_back(std::make_unique<Engine>());
  engines_.back()->subspace =
      make_subspace(contrast.channels, participant_->forward->gain, contrast.noise_V2);
  return *engines_.back();
}

std::vector<WindowDipoles> Locator::dipoles(std::size_t place,
                                            const std::vector<TimeWindow>& windows) {
  const auto& contrast = participant_->contrasts[place];
  // The scan does not use the noise: any engine's will do.
  Engine& engine = engines_.empty() ? engine_for(contrast) : *engines_.front();
  if (!engine.scan)
    engine.scan = std::make_unique<DipoleScan>(engine.subspace, participant_->forward->grid);
  std::vector<WindowDipoles> result;
  const auto& parts = participant_->parts_of(place);
  for (std::size_t w = 0; w < windows.size(); ++w) {
    WindowDipoles dipoles{windows[w], samples_in(contrast.times_s, windows[w]), {}, {}, {}};
    const auto data = contrast.data_V.middleCols(dipoles.samples.first, dipoles.samples.count);
    dipoles.influence = influence_on_dipoles(*participant_->forward, *engine.scan, data, parts, w);
    dipoles.mean = engine.scan->judge(data.rowwise().mean());
    for (Eigen::Index t = 0; t < data.cols(); ++t)
      dipoles.at_sample.push_back(engine.scan->judge(data.col(t)));
    result.push_back(std::move(dipoles));
  }
  return result;
}

LocatedContrast Locator::locate(std::size_t place, const std::string& method,
                                const std::vector<TimeWindow>& windows) {
  const auto& contrast = participant_->contrasts[place];
  const auto& forward = *participant_->forward;
  Engine& engine = engine_for(contrast);
  const double scale = noise_scale(engine.subspace, contrast.noise_V2);
  LocatedContrast located;
  const auto spectrum = engine.estimate(*experiment_, *participant_, method,
                                        window_samples(contrast, windows), scale, located);
  located.estimate = estimate_sources(located.inverse, contrast.data_V);
  const auto lobe_forms = region_forms(located.inverse, forward.lobes);
  const bool own_regions = !experiment_->regions.empty();
  located.courses = region_courses(
      located.inverse, own_regions ? region_forms(located.inverse, forward.regions) : lobe_forms,
      contrast.data_V, forward.regions, forward.outward);
  const PowerIndices indices(
      located.inverse, lobe_forms, engine.subspace.basis, contrast.noise_V2, forward.lobes,
      {400, experiment_->seed, participant_->name + " " + contrast.name + " " + method});
  for (std::size_t w = 0; w < windows.size(); ++w) {
    LocatedWindow part{windows[w], samples_in(contrast.times_s, windows[w]), {}, {}, {}, {}, {}};
    part.map = window_map(located.estimate.amplitude, part.samples);
    part.peaks = find_peaks(forward.neighbours, part.map, located.estimate.amplitude,
                            contrast.times_s, part.samples);
    part.indices = indices.at(contrast.data_V, part.samples);
    const auto data = contrast.data_V.middleCols(part.samples.first, part.samples.count);
    part.influence =
        influence_on_map(forward, located.inverse, data, participant_->parts_of(place), w);
    const GramSpectrum& used = spectrum ? *spectrum : GramSpectrum{};
    if (spectrum) {
      const Eigen::MatrixXd z = spectrum_map(engine.subspace, used) * data;
      part.fit = ridge_fit(engine.subspace, used, z, located.regularisation.used * scale, scale);
    } else {
      const Eigen::MatrixXd white =
          engine.subspace.whitener * (engine.subspace.basis.transpose() * data);
      constexpr double kNone = std::numeric_limits<double>::quiet_NaN();
      part.fit = {kNone, kNone,
                  std::sqrt(white.squaredNorm() / (static_cast<double>(white.size()) * scale))};
    }
    located.windows.push_back(std::move(part));
  }
  return located;
}

}  // namespace headwater
