// SPDX-License-Identifier: GPL-3.0-or-later
// What estimates of a noise covariance share, be they from averages or from trials. p: size of the
// subspace.
#pragma once
#include <headwater/signal/noise_covariance.hpp>

#include <Eigen/Core>

namespace headwater {

/// tau of noise_covariance.hpp. lags: T by T, the sum over blocks of block' block (each block p by
/// T in any orthonormal basis), so that its k-th diagonal sums to the autocovariance at lag k.
double correlation_factor(const Eigen::MatrixXd& lags);

/// Weight by Ledoit & Wolf from sums: S, the sum over samples of |x|^4, and the number of samples
/// x, of which S is sum x x' / divisor.
double ledoit_wolf_weight(const Eigen::MatrixXd& sample_covariance, double fourth_powers,
                          double count, double divisor, double tau);

/// Shrinks by `weight`, counts rank and condition, and refuses a singular result (InputError) and a
/// weight outside 0 to 1 (ExperimentError). noise.source is for the message.
void shrink_noise(NoiseCovariance& noise, const Eigen::MatrixXd& sample_covariance, double weight);

/// A single-trial covariance in the subspace of some of its channels. Throws InputError that lists
/// the channels it does not have.
Eigen::MatrixXd covariance_of(const NoiseCovariance& noise, const Labels& channels);

}  // namespace headwater
