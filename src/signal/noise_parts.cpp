// SPDX-License-Identifier: GPL-3.0-or-later
// Ledoit-Wolf weight. Their S is a mean of n outer products; with y = sqrt(n/divisor) r ours is
// too: S = (1/n) sum y y'. Then, with <A,B> = tr(AB'),
//   m = tr(S)/p,  d^2 = |S - m I|^2,  b^2 = min(d^2, tau/(divisor n) sum |y y' - S|^2),  a =
//   b^2/d^2,
// which is their eq. (14) and lemmas 3.2-3.4 for divisor = n, tau = 1 (their norm is divided by p,
// which cancels). sum |y y' - S|^2 = sum |y|^4 - n |S|^2. The divisor in place of one n counts what
// the subtracted means have used up; tau counts what the samples tell twice.
//
// tau = 1 + 2 sum_k (1 - k/T) rho_k^2 from the sample autocorrelation r_k = c_k/c_0 with the usual
// divisor T for every lag (Box & Jenkins). c_k is the sum over channels of the autocovariance, i.e.
// the mean over channels weighted by variance: it depends on neither the basis nor the reference.
#include "noise_parts.hpp"

#include <headwater/base/error.hpp>
#include <headwater/signal/reference.hpp>

#include <Eigen/Eigenvalues>
#include <fmt/core.h>

#include <algorithm>
#include <limits>

namespace headwater {
namespace {

constexpr double kRankTolerance = 1e-10, kSingular = 1e-12;

}  // namespace

double correlation_factor(const Eigen::MatrixXd& lags) {
  const Eigen::Index samples = lags.rows();
  const double variance = lags.trace();
  double tau = 1;
  if (!(variance > 0)) return tau;
  for (Eigen::Index lag = 1; lag < samples; ++lag) {
    const double correlation = lags.diagonal(lag).sum() / variance;
    const double weight = 1 - static_cast<double>(lag) / static_cast<double>(samples);
    tau += 2 * weight * correlation * correlation;
  }
  return tau;
}

double ledoit_wolf_weight(const Eigen::MatrixXd& sample_covariance, double fourth_powers,
                          double count, double divisor, double tau) {
  Eigen::MatrixXd off_target = sample_covariance;
  off_target.diagonal().array() -=
      sample_covariance.trace() / static_cast<double>(sample_covariance.rows());
  const double distance = off_target.squaredNorm();
  if (!(distance > 0)) return 0;  // already a multiple of the identity: any weight gives the same
  const double fourth = fourth_powers * (count / divisor) * (count / divisor);
  const double error = tau * (fourth / count - sample_covariance.squaredNorm()) / divisor;
  return std::clamp(error / distance, 0.0, 1.0);
}

double ledoit_wolf_weight(const Eigen::MatrixXd& samples, double divisor, double tau) {
  return ledoit_wolf_weight(samples * samples.transpose() / divisor,
                            samples.colwise().squaredNorm().squaredNorm(),
                            static_cast<double>(samples.cols()), divisor, tau);
}

void shrink_noise(NoiseCovariance& noise, const Eigen::MatrixXd& sample_covariance, double weight) {
  if (!(weight >= 0 && weight <= 1))
    throw ExperimentError(
        fmt::format("Noise covariance: shrinkage is {}, expected a number from 0 to 1.", weight));
  const Eigen::Index p = sample_covariance.rows();
  const Eigen::VectorXd before =
      Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd>(sample_covariance, Eigen::EigenvaluesOnly)
          .eigenvalues();
  const double largest = before[p - 1];
  noise.rank = largest > 0 ? (before.array() > kRankTolerance * largest).count() : 0;
  noise.shrinkage = weight;
  const double mean = sample_covariance.trace() / static_cast<double>(p);
  noise.single_trial_V2 = (1 - weight) * sample_covariance;
  noise.single_trial_V2.diagonal().array() += weight * mean;
  // The target is a multiple of the identity: eigenvalues move, eigenvectors stay.
  const double low = (1 - weight) * before[0] + weight * mean;
  const double high = (1 - weight) * largest + weight * mean;
  noise.condition = low > 0 ? high / low : std::numeric_limits<double>::infinity();
  if (!(low > kSingular * high))
    throw InputError(fmt::format(
        "Noise covariance ({}): singular: rank {} of {} ({} channels) with shrinkage {:.3g}. Use a "
        "larger shrinkage (or the automatic one), a longer window, or drop flat and duplicate "
        "channels.",
        noise.source, noise.rank, p, p + 1, weight));
}

// B C B' holds the covariance against the average reference; rows of the channels kept differ from
// any other reference by a constant, which the smaller basis removes.
Eigen::MatrixXd covariance_of(const NoiseCovariance& noise, const Labels& channels) {
  if (channels == noise.channels) return noise.single_trial_V2;
  const auto kept = match_labels(channels, noise.channels, "Noise covariance");
  const Eigen::MatrixXd wide =
      reference_free_basis(static_cast<Eigen::Index>(noise.channels.size()));
  Eigen::MatrixXd rows(static_cast<Eigen::Index>(kept.size()), wide.cols());
  for (std::size_t i = 0; i < kept.size(); ++i)
    rows.row(static_cast<Eigen::Index>(i)) = wide.row(kept[i]);
  const Eigen::MatrixXd map = reference_free_basis(rows.rows()).transpose() * rows;
  return map * noise.single_trial_V2 * map.transpose();
}

}  // namespace headwater
