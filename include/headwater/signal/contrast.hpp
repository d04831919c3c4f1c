// SPDX-License-Identifier: GPL-3.0-or-later
// Contrasts of conditions: weights, or crossed factor effects of any order.
#pragma once
#include <headwater/signal/average.hpp>
#include <headwater/signal/noise_covariance.hpp>

#include <Eigen/Core>

#include <map>
#include <string>
#include <vector>

namespace headwater {

struct Condition {
  std::string name;
  std::map<std::string, std::string> factors;  ///< factor -> level
};

struct ConditionWeight {
  std::string condition;
  double weight = 0;
};

/// One factor of an effect: `first` minus `second`.
struct EffectFactor {
  std::string factor, first, second;
};

/// Weights of an effect. Over the conditions whose levels are among those named, the sign is the
/// product over factors of +1 (first) or -1 (second); the weight is the sign divided by the number
/// of conditions that share this combination of levels. One factor: difference of level means (main
/// effect, +-1/2 in a 2 x 2 design). Two: difference of differences (+-1). And so on. Throws
/// ExperimentError: unknown factor or level (with a suggestion), an empty cell (named).
std::vector<ConditionWeight> effect_weights(const std::vector<Condition>& conditions,
                                            const std::vector<EffectFactor>& effect);

/// A contrast of one participant. Noise of the contrast: C / n_eff, n_eff = 1 / sum_k w_k^2 / n_k.
struct ContrastWaveform {
  std::string name;
  Labels channels;
  Eigen::VectorXd times_s;
  Eigen::MatrixXd data_V;  ///< #channels by #samples, average reference
  double effective_trials = 0;
  Eigen::MatrixXd noise_V2;  ///< (M-1) by (M-1): covariance of the contrast in the subspace
};

/// Throws InputError when a weighted condition has no average.
ContrastWaveform form_contrast(const std::string& name, const std::vector<ConditionWeight>& weights,
                               const std::vector<Average>& averages, const NoiseCovariance& noise);

/// Mean over S participants: waveforms averaged; covariance sum_s C_s / S^2; effective trials such
/// that the mean over channels of the variance agrees: n = tr(mean of single-trial C_s) /
/// tr(noise). Channels: those common to all, in the order of the first. `noise_of` gives each
/// participant's single-trial covariance, in the same order.
ContrastWaveform mean_contrast(const std::vector<ContrastWaveform>& contrasts,
                               const std::vector<NoiseCovariance>& noise_of);

}  // namespace headwater
