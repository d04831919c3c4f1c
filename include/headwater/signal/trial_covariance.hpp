// SPDX-License-Identifier: GPL-3.0-or-later
// Covariances out of single trials, in the subspace orthogonal to the reference.
//   noise  residuals r about each condition's mean, pooled over conditions k with n_k trials and
//          the T samples of the baseline (all samples where there is none):
//          C = sum r r' / degrees,  degrees = sum_k (n_k - 1) * T, times (T-1)/T where each trial's
//          mean over just those samples was removed. Exact for samples independent in time; of
//          noise correlated as rho(s-t) a removed mean takes more, and the estimate is of C times
//          (T - tau1)/(T - 1), tau1 = sum_st rho(s-t) / T: of what varies about the baseline's
//          mean, which is what a baseline-corrected average's baseline holds. A window of other
//          samples, or no removal, gives C itself.
//   data   about zero, all trials of all conditions, samples of the active window:
//          Cd = sum x x' / (T sum_k n_k)    - the power a beamformer has to pass or to stop
// Which samples: where each trial's mean over a short baseline is subtracted, slow noise is small
// in the baseline and grows after it, to twice the variance where the two are independent. The
// noise of a later window is that of the whole epoch; that of the baseline understates it, and with
// it flatters every signal-to-noise ratio. Shrinkage as in noise_covariance.hpp; or OAS (Chen et
// al. 2010 IEEE TSP 58:5016, eq. 23), with n replaced by the number of independent samples:
//   rho = min(1, ((1 - 2/p) tr(S^2) + tr(S)^2) / ((n + 1 - 2/p) (tr(S^2) - tr(S)^2/p)))
#pragma once
#include <headwater/signal/noise_covariance.hpp>
#include <headwater/signal/trials.hpp>

#include <Eigen/Core>

namespace headwater {

double oas_weight(const Eigen::MatrixXd& sample_covariance, double independent_samples);

/// Of a single trial. Uses options.shrinkage, options.oas and the baseline window (equal ends: the
/// trials' own baseline, else all samples). Errors (InputError): no trial, no condition with two
/// trials, a singular matrix after shrinkage (rank, channels, what to do).
NoiseCovariance estimate_trial_noise(const Trials& trials, const NoiseOptions& options);

/// (M-1) by (M-1), V^2. Throws InputError without a sample.
Eigen::MatrixXd trial_data_covariance(const Trials& trials, double from_s, double to_s);

/// Does the noise covariance fit the averages it is used for? Their baseline, whitened by C/n_k,
/// has mean square 1 if so: above 1 where noise is locked to the events or trials are not
/// independent, below 1 where the covariance is too large.
struct Whiteness {
  /// Over channels, samples and conditions, by degrees of freedom: one less for each average of
  /// which the mean over the window is removed. NaN (and so the others): fewer than 2 samples.
  double mean_square = 0;
  /// 95 % range expected of white noise with the baseline's independent samples; it is about 1 for
  /// a covariance that is known, and moved by what shrinkage and the samples that the covariance
  /// was estimated from do to it (trial_covariance.cpp). 0 to infinity: too few samples to say.
  double low = 0, high = 0;
  double largest = 0;  ///< largest eigenvalue of the whitened baseline's covariance
  bool white = true;   ///< mean_square inside the range; also where there is no baseline to ask
};

/// Baseline: samples from from_s to to_s, both included. Throws InputError: no average, a channel
/// that the covariance does not have, a covariance that is not positive definite.
Whiteness check_whiteness(const std::vector<Average>& averages, const NoiseCovariance& noise,
                          double from_s, double to_s);

}  // namespace headwater
