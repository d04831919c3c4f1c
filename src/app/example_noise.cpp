// SPDX-License-Identifier: GPL-3.0-or-later
#include "example_noise.hpp"

#include <headwater/base/random.hpp>
#include <headwater/base/units.hpp>
#include <headwater/model/lead_field.hpp>
#include <headwater/signal/reference.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <cmath>

namespace headwater {
namespace {

constexpr double kFrequencyStep_Hz = 0.5;  // repeats after 2 s, longer than an epoch
constexpr double kPatchReach = 2.5;        // SDs

template <typename Power>
Eigen::MatrixXd spectrum_rows(const EvenSpread& band_Hz, const Eigen::VectorXd& times_s,
                              Power power) {
  const auto count =
      static_cast<Eigen::Index>(std::lround((band_Hz.to - band_Hz.from) / kFrequencyStep_Hz)) + 1;
  Eigen::MatrixXd rows(2 * count, times_s.size());
  double total = 0;
  for (Eigen::Index k = 0; k < count; ++k) {
    const double frequency = band_Hz.from + kFrequencyStep_Hz * static_cast<double>(k);
    const Eigen::ArrayXd phase = 2 * kPi * frequency * times_s.array();
    rows.row(2 * k) = std::sqrt(power(frequency)) * phase.cos().matrix().transpose();
    rows.row(2 * k + 1) = std::sqrt(power(frequency)) * phase.sin().matrix().transpose();
    total += power(frequency);
  }
  return rows / std::sqrt(total);
}

Eigen::VectorXd patch_map(const Eigen::MatrixXd& gain, const Eigen::Matrix3Xd& points_m,
                          Eigen::Index centre, const Eigen::Vector3d& direction, double sd_m) {
  Eigen::VectorXd map = Eigen::VectorXd::Zero(gain.rows());
  for (Eigen::Index p = 0; p < points_m.cols(); ++p) {
    const double distance = (points_m.col(p) - points_m.col(centre)).norm() / sd_m;
    if (distance < kPatchReach)
      map += std::exp(-0.5 * distance * distance) * (gain.middleCols(3 * p, 3) * direction);
  }
  return map;
}

/// Maps of patches about random ones of the candidates; mean power over leads 1.
Eigen::MatrixXd draw_maps(const Eigen::MatrixXd& gain, const Eigen::Matrix3Xd& points_m,
                          const std::vector<Eigen::Index>& candidates, int patches, double sd_m,
                          RandomStream stream) {
  Eigen::MatrixXd maps(gain.rows(), patches);
  for (Eigen::Index k = 0; k < maps.cols(); ++k) {
    const auto pick =
        static_cast<std::size_t>(stream.uniform() * static_cast<double>(candidates.size()));
    const Eigen::Vector3d direction = stream.normal_matrix(3, 1).col(0).normalized();
    maps.col(k) = patch_map(gain, points_m, candidates[pick], direction, sd_m);
  }
  const double power =
      (average_reference(gain.rows()) * maps).squaredNorm() / static_cast<double>(gain.rows());
  return maps / std::sqrt(power);
}

}  // namespace

BackgroundSpectra background_spectra(const ExampleBackground& background,
                                     const Eigen::VectorXd& times_s) {
  BackgroundSpectra spectra;
  spectra.broad =
      spectrum_rows(background.band_Hz, times_s, [](double frequency) { return 1 / frequency; });
  const NormalSpread& alpha = background.alpha_Hz;
  const EvenSpread band{alpha.mean - 3 * alpha.sd, alpha.mean + 3 * alpha.sd};
  spectra.alpha = spectrum_rows(band, times_s, [&](double frequency) {
    const double distance = (frequency - alpha.mean) / alpha.sd;
    return std::exp(-0.5 * distance * distance);
  });
  return spectra;
}

BackgroundMaps background_maps(const ExampleBackground& background, const SourceGrid& lattice,
                               double lattice_radius_m, const ExamplePerson& person,
                               std::uint64_t seed) {
  const Eigen::Matrix3Xd points = lattice.head_m * (person.head_radius_m() / lattice_radius_m);
  const Eigen::MatrixXd gain = compute_gain(person.head, person.electrodes, points);
  std::vector<Eigen::Index> all, behind;
  for (Eigen::Index p = 0; p < lattice.size(); ++p) {
    all.push_back(p);
    if (lattice.mni_m(1, p) < background.alpha_behind_m) behind.push_back(p);
  }
  const auto stream = [&](std::string_view of) {
    return RandomStream(seed, fmt::format("example {} {}", person.name, of));
  };
  const double rms = person.background_rms_V, share = background.alpha_share;
  BackgroundMaps maps;
  maps.broad =
      rms * std::sqrt(1 - share) *
      draw_maps(gain, points, all, background.patches, background.patch_m, stream("patches"));
  maps.alpha = rms * std::sqrt(share) *
               draw_maps(gain, points, behind, background.alpha_patches, background.patch_m,
                         stream("alpha patches"));
  return maps;
}

Eigen::MatrixXd draw_background(const ExampleRecipe& recipe, const BackgroundSpectra& spectra,
                                const BackgroundMaps& maps, const ExamplePerson& person,
                                std::size_t condition, std::uint64_t seed) {
  RandomStream stream(seed, fmt::format("example {} {} background", person.name,
                                        recipe.conditions[condition].name));
  const Eigen::Index channels = person.electrodes.cols(), samples = recipe.times_s.size();
  // Maps times amplitudes first: the product with the time courses is then #channels by few.
  Eigen::MatrixXd amplitudes = stream.normal_matrix(maps.broad.cols(), spectra.broad.rows());
  Eigen::MatrixXd trial = (maps.broad * amplitudes) * spectra.broad;
  amplitudes = stream.normal_matrix(maps.alpha.cols(), spectra.alpha.rows());
  trial += (maps.alpha * amplitudes) * spectra.alpha;
  trial += recipe.background.sensor_V * stream.normal_matrix(channels, samples);
  return trial / std::sqrt(static_cast<double>(person.trials[condition]));
}

}  // namespace headwater
