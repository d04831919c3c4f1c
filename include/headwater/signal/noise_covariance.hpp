// SPDX-License-Identifier: GPL-3.0-or-later
// Noise covariance of a single trial, in the subspace orthogonal to the reference (reference.hpp).
//
// An average of n trials carries noise of covariance C/n, C that of one trial. So:
//   baseline  C = sum_k n_k sum_t r r' / sum_k (T-1), r = B'(d_k(t) - mean over the window)
//   residual  where there is no baseline: samples later than a stated latency. The trial-weighted
//   mean
//             over conditions is subtracted at each sample (it carries what the conditions share),
//             then each channel's straight line over the window: C = sum_k n_k sum_t r r' /
//             ((K-1)(T-2)); with one condition only the line is subtracted: / (T-2). Response
//             differences that outlast the latency count as noise.
//   table     the user's, labelled, uV^2, one trial.
// Shrinkage towards scaled identity: S* = (1-a) S + a tr(S)/p I. Weight a: Ledoit & Wolf 2004
// J Multivar Anal 88:365, with the variance of S enlarged by tau = 1 + 2 sum_k (1-k/T) rho_k^2 for
// samples that are correlated in time (rho_k: mean autocorrelation over channels, weighted by
// variance, at lag k, Bartlett's formula; common practice), or a number from the user.
#pragma once
#include <headwater/signal/average.hpp>

#include <Eigen/Core>

#include <filesystem>
#include <optional>
#include <string>
#include <vector>

namespace headwater {

struct NoiseCovariance {
  Labels channels;
  Eigen::MatrixXd single_trial_V2;  ///< (M-1) by (M-1), B'C B, after shrinkage, V^2
  double shrinkage = 0;             ///< weight a
  Eigen::Index rank = 0;            ///< before shrinkage: eigenvalues above 1e-10 of the largest
  double condition = 0;             ///< largest / smallest eigenvalue after shrinkage
  Eigen::Index samples = 0;         ///< degrees of freedom counted in the denominator
  double independent_samples = 0;   ///< samples / tau
  std::string source;               ///< sentence for the report
};

struct NoiseOptions {
  enum class From { baseline, residual, table, trials } from = From::baseline;
  double baseline_from_s = 0, baseline_to_s = 0;  ///< both ends included; equal: all samples < 0
  double after_s = 0;                             ///< residual: samples at or after this latency
  std::filesystem::path table;
  std::optional<double> shrinkage;  ///< 0 to 1; empty: estimated (table: 0)
  bool oas = false;                 ///< estimated by OAS (trial_covariance.hpp), else Ledoit-Wolf
  bool whole_epoch = false;         ///< of trials: all samples, whatever the baseline
};

/// From averages of one participant (consistent channels and times). Throws InputError: no sample
/// in the window, fewer than 5 samples, zero trials, and - after shrinkage - a matrix that is
/// singular (smallest eigenvalue below 1e-12 of the largest): says rank, channels, and to use
/// shrinkage.
NoiseCovariance estimate_noise(const std::vector<Average>& averages, const NoiseOptions& options);

/// The user's table: first column `name`, then one column for each channel, uV^2 of a single trial;
/// rows and columns joined to `channels` by name (case ignored). Must be symmetric to 1e-6 of its
/// largest entry and positive semidefinite; mapped by B. Errors as above.
NoiseCovariance read_noise_table(const std::filesystem::path& path, const Labels& channels,
                                 const std::optional<double>& shrinkage);

/// Shrinks `sample_covariance` (p by p) in place of the above when the samples are at hand: exposed
/// for tests and for data covariances. samples: p by n, zero mean, so that sample_covariance is
/// samples samples' / divisor.
double ledoit_wolf_weight(const Eigen::MatrixXd& samples, double divisor, double tau);

}  // namespace headwater
