// SPDX-License-Identifier: GPL-3.0-or-later
// Sums are made over average-referenced channels, M by M, and mapped by B at the end: B'H = B', and
// what all channels share - often far larger than the rest - is gone before anything is squared.
//
// Expected mean square of the whitened baseline. Whitening by C* = (1-a) S + a m I, S from N
// independent samples, leaves noise of covariance C with the mean square (1/p) E tr(C*^-1 C). With
// C* = (1-a) (S + l I), l = a m / (1-a), and g = (1/p) tr(S (S + l I)^-1) = 1 - a m tr(C*^-1)/p,
//   (1/p) tr((S + l I)^-1 C) -> g / (1 - g p/N)     (Chen, Paul, Prentice & Wang 2011 JASA
//   106:1345)
// as p and N grow together; for a = 0 this is N/(N-p), the inverse Wishart's mean but for a one.
#include "noise_parts.hpp"
#include "problems.hpp"

#include <headwater/base/distributions.hpp>
#include <headwater/base/eigenproblem.hpp>
#include <headwater/base/error.hpp>
#include <headwater/signal/reference.hpp>
#include <headwater/signal/time_window.hpp>
#include <headwater/signal/trial_covariance.hpp>

#include <Eigen/Cholesky>
#include <fmt/core.h>

#include <algorithm>
#include <cmath>
#include <limits>

namespace headwater {
namespace {

/// Samples that the noise is taken from.
struct Window {
  SampleRange range;
  bool mean_removed = false;  ///< each trial's mean over just these samples is zero
  std::string name;
};

Window noise_window(const Trials& trials, const NoiseOptions& options) {
  const bool own = options.baseline_from_s == options.baseline_to_s;
  if (options.whole_epoch || (own && !trials.baseline_removed))
    return {{0, trials.times_s.size()}, false, "all samples"};
  const auto [from, to] =
      own ? trials.baseline_s : std::pair(options.baseline_from_s, options.baseline_to_s);
  Window window;
  window.name = fmt::format("baseline from {:.6g} to {:.6g} s", from, to);
  window.range = samples_in(trials.times_s, {window.name, from, to, {}});
  if (trials.baseline_removed) {
    const SampleRange removed = samples_in(
        trials.times_s, {"baseline", trials.baseline_s.first, trials.baseline_s.second, {}});
    window.mean_removed =
        removed.first == window.range.first && removed.count == window.range.count;
  }
  if (window.mean_removed && window.range.count < 2)
    throw InputError(fmt::format(
        "Noise covariance: one sample in the {}, and its mean is removed: nothing is left. Widen "
        "the baseline, or give a window of samples to take the noise from.",
        window.name));
  return window;
}

/// Samples of one trial against the average reference.
Eigen::MatrixXd referenced(const Trials& trials, Eigen::Index trial, const SampleRange& range) {
  Eigen::MatrixXd x = trials.trial(trial).middleCols(range.first, range.count);
  x.rowwise() -= x.colwise().mean().eval();
  return x;
}

/// Sums over the residuals r, M by T of each trial.
struct ResidualSums {
  Eigen::MatrixXd products;  ///< r r', M by M
  Eigen::MatrixXd lags;      ///< r' r, T by T
  double fourth_powers = 0;  ///< of the length of each sample
  Eigen::Index trials = 0, conditions = 0;
};

ResidualSums residual_sums(const Trials& trials, const SampleRange& range) {
  const Eigen::Index channels = trials.data_V.rows();
  std::vector<Eigen::MatrixXd> means(trials.conditions.size(),
                                     Eigen::MatrixXd::Zero(channels, range.count));
  std::vector<Eigen::Index> counts(trials.conditions.size(), 0);
  for (Eigen::Index k = 0; k < trials.count(); ++k) {
    const std::size_t place = trials.condition[static_cast<std::size_t>(k)];
    means[place] += referenced(trials, k, range);
    ++counts[place];
  }
  ResidualSums sums;
  for (std::size_t place = 0; place < means.size(); ++place) {
    if (counts[place] < 2) continue;  // a single trial is its own mean
    means[place] /= static_cast<double>(counts[place]);
    sums.trials += counts[place];
    ++sums.conditions;
  }
  sums.products = Eigen::MatrixXd::Zero(channels, channels);
  sums.lags = Eigen::MatrixXd::Zero(range.count, range.count);
  for (Eigen::Index k = 0; k < trials.count(); ++k) {
    const std::size_t place = trials.condition[static_cast<std::size_t>(k)];
    if (counts[place] < 2) continue;
    const Eigen::MatrixXd r = referenced(trials, k, range) - means[place];
    sums.products.selfadjointView<Eigen::Lower>().rankUpdate(r);
    sums.lags.selfadjointView<Eigen::Upper>().rankUpdate(r.transpose());
    sums.fourth_powers += r.colwise().squaredNorm().squaredNorm();
  }
  return sums;
}

/// B' A B of a symmetric matrix of which the lower half is filled.
Eigen::MatrixXd in_subspace(const Eigen::MatrixXd& lower) {
  const Eigen::MatrixXd basis = reference_free_basis(lower.rows());
  const Eigen::MatrixXd half = lower.selfadjointView<Eigen::Lower>() * basis;
  return basis.transpose() * half;
}

void check_trials(const Trials& trials, const std::string& where) {
  if (trials.count() == 0) throw InputError(where + ": there is no trial.");
  if (trials.data_V.rows() < 2)
    throw InputError(
        fmt::format("{}: {} channel, at least 2 are needed.", where, trials.data_V.rows()));
}

/// The averages' samples in the window, whitened by C/n_k, side by side, and what became of their
/// degrees of freedom.
struct WhitenedBaseline {
  Eigen::MatrixXd samples;  ///< p by (T * conditions)
  Eigen::MatrixXd lags;     ///< T by T
  double degrees = 0;       ///< samples, less one of each average of which the mean is removed
};

WhitenedBaseline whiten(const std::vector<Average>& averages, const Eigen::MatrixXd& covariance,
                        const SampleRange& range) {
  const Eigen::LLT<Eigen::MatrixXd> factor(covariance);
  if (factor.info() != Eigen::Success)
    throw InputError("Whiteness: the noise covariance is not positive definite. Shrink it.");
  const Eigen::MatrixXd basis = reference_free_basis(covariance.rows() + 1);
  WhitenedBaseline result;
  result.samples.resize(covariance.rows(),
                        range.count * static_cast<Eigen::Index>(averages.size()));
  result.lags = Eigen::MatrixXd::Zero(range.count, range.count);
  Eigen::Index at = 0;
  for (const Average& average : averages) {
    Eigen::MatrixXd z = basis.transpose() * average.data_V.middleCols(range.first, range.count);
    z = std::sqrt(average.trials) * factor.matrixL().solve(z);
    // Written averages are rounded: a removed mean is not quite zero. One that was left in has a
    // share of the power that is not small, since noise is slow.
    constexpr double kRemoved = 1e-4;
    const auto samples = static_cast<double>(range.count);
    const bool removed = samples * z.rowwise().mean().squaredNorm() < kRemoved * z.squaredNorm();
    result.degrees += removed ? samples - 1 : samples;
    result.lags += z.transpose() * z;
    result.samples.middleCols(at, range.count) = z;
    at += range.count;
  }
  return result;
}

/// Mean square to be expected of whitened noise, see the top; infinite where the samples are too
/// few to say.
double expected_mean_square(const NoiseCovariance& noise, const Eigen::MatrixXd& covariance) {
  const auto p = static_cast<double>(covariance.rows());
  const double a = noise.shrinkage;
  if (!(a < 1)) return 1;  // C* = m I whatever the samples, and m = tr(C)/p
  const double inverse_trace =
      covariance.llt()
          .solve(Eigen::MatrixXd::Identity(covariance.rows(), covariance.rows()))
          .trace();
  const double g = 1 - a * covariance.trace() / p * inverse_trace / p;
  const double share = noise.independent_samples > 0 ? g * p / noise.independent_samples : 0;
  return share < 1 ? g / (1 - a) / (1 - share) : std::numeric_limits<double>::infinity();
}

}  // namespace

double oas_weight(const Eigen::MatrixXd& sample_covariance, double independent_samples) {
  const auto p = static_cast<double>(sample_covariance.rows());
  const double trace = sample_covariance.trace(), squares = sample_covariance.squaredNorm();
  const double above = (1 - 2 / p) * squares + trace * trace;
  const double below = (independent_samples + 1 - 2 / p) * (squares - trace * trace / p);
  return below > above ? above / below : 1;  // at most 1; also for a multiple of the identity
}

NoiseCovariance estimate_trial_noise(const Trials& trials, const NoiseOptions& options) {
  check_trials(trials, "Noise covariance");
  const Window window = noise_window(trials, options);
  const ResidualSums sums = residual_sums(trials, window.range);
  if (sums.conditions == 0)
    throw InputError(fmt::format(
        "Noise covariance: none of {} conditions has two trials, but residuals need a mean of "
        "several. Join conditions, ease the rejection, or take the noise from averages.",
        trials.conditions.size()));
  const Eigen::Index samples = window.range.count - (window.mean_removed ? 1 : 0);
  NoiseCovariance noise;
  noise.channels = trials.channels;
  noise.samples = (sums.trials - sums.conditions) * samples;
  const auto degrees = static_cast<double>(noise.samples);
  const double tau = correlation_factor(sums.lags);
  noise.independent_samples = degrees / tau;
  noise.source = fmt::format(
      "residuals of {} trials about the mean of their condition ({}), {}, {} "
      "samples each{}",
      sums.trials, sums.conditions, window.name, window.range.count,
      window.mean_removed ? ", mean removed" : "");
  const Eigen::MatrixXd covariance = in_subspace(sums.products) / degrees;
  const auto columns = static_cast<double>(sums.trials * window.range.count);
  shrink_noise(noise, covariance,
               options.shrinkage ? *options.shrinkage
               : options.oas
                   ? oas_weight(covariance, noise.independent_samples)
                   : ledoit_wolf_weight(covariance, sums.fourth_powers, columns, degrees, tau));
  return noise;
}

Eigen::MatrixXd trial_data_covariance(const Trials& trials, double from_s, double to_s) {
  check_trials(trials, "Data covariance");
  const SampleRange range = samples_in(trials.times_s, {"data covariance", from_s, to_s, {}});
  const Eigen::Index channels = trials.data_V.rows();
  Eigen::MatrixXd products = Eigen::MatrixXd::Zero(channels, channels);
  for (Eigen::Index k = 0; k < trials.count(); ++k)
    products.selfadjointView<Eigen::Lower>().rankUpdate(referenced(trials, k, range));
  return in_subspace(products) / static_cast<double>(range.count * trials.count());
}

Whiteness check_whiteness(const std::vector<Average>& averages, const NoiseCovariance& noise,
                          double from_s, double to_s) {
  if (averages.empty()) throw InputError("Whiteness: there is no average.");
  const Eigen::VectorXd& times = averages.front().times_s;
  const double slack = 1e-6;  // as in samples_in(), which throws where we have an answer
  Eigen::Index first = 0, last = times.size();
  while (first < last && times[first] < from_s - slack) ++first;
  while (last > first && times[last - 1] > to_s + slack) --last;
  Whiteness result;
  if (last - first < 2) {
    result.mean_square = result.low = result.high = result.largest =
        std::numeric_limits<double>::quiet_NaN();
    return result;
  }
  const Eigen::MatrixXd covariance = covariance_of(noise, averages.front().channels);
  const WhitenedBaseline baseline = whiten(averages, covariance, {first, last - first});
  const auto p = static_cast<double>(covariance.rows());
  result.mean_square = baseline.samples.squaredNorm() / (p * baseline.degrees);
  result.largest =
      largest_eigenpair(baseline.samples * baseline.samples.transpose() / baseline.degrees).value;
  const double expected = expected_mean_square(noise, covariance);
  const double degrees = p * baseline.degrees / correlation_factor(baseline.lags);
  if (std::isfinite(expected)) {
    result.low = expected * chi_squared_quantile(0.025, degrees) / degrees;
    result.high = expected * chi_squared_quantile(0.975, degrees) / degrees;
  } else {
    result.high = expected;
  }
  result.white = result.mean_square >= result.low && result.mean_square <= result.high;
  return result;
}

}  // namespace headwater
