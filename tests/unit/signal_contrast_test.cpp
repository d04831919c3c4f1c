// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal_support.hpp"

#include <headwater/base/error.hpp>
#include <headwater/signal/contrast.hpp>
#include <headwater/signal/reference.hpp>

#include <gtest/gtest.h>

namespace headwater {
namespace {

std::vector<Condition> crossed(int factors) {
  std::vector<Condition> conditions;
  for (int cell = 0; cell < 1 << factors; ++cell) {
    Condition condition;
    for (int f = 0; f < factors; ++f) {
      const std::string factor(1, static_cast<char>('A' + f));
      const std::string level = (cell >> f & 1) ? "2" : "1";
      condition.factors[factor] = level;
      condition.name.append(factor).append(level);
    }
    conditions.push_back(condition);
  }
  return conditions;
}

std::map<std::string, double> by_name(const std::vector<ConditionWeight>& weights) {
  std::map<std::string, double> result;
  for (const ConditionWeight& part : weights) result[part.condition] = part.weight;
  return result;
}

using Weights = std::map<std::string, double>;

TEST(SignalContrast, TwoByTwoByHand) {
  const auto conditions = crossed(2);
  EXPECT_EQ(by_name(effect_weights(conditions, {{"A", "1", "2"}})),
            (Weights{{"A1B1", 0.5}, {"A2B1", -0.5}, {"A1B2", 0.5}, {"A2B2", -0.5}}));
  EXPECT_EQ(by_name(effect_weights(conditions, {{"B", "2", "1"}})),
            (Weights{{"A1B1", -0.5}, {"A2B1", -0.5}, {"A1B2", 0.5}, {"A2B2", 0.5}}));
  EXPECT_EQ(by_name(effect_weights(conditions, {{"A", "1", "2"}, {"B", "1", "2"}})),
            (Weights{{"A1B1", 1}, {"A2B1", -1}, {"A1B2", -1}, {"A2B2", 1}}));
}

TEST(SignalContrast, ThreeFactorsByHand) {
  const auto conditions = crossed(3);
  EXPECT_EQ(
      by_name(effect_weights(conditions, {{"A", "1", "2"}, {"B", "1", "2"}, {"C", "1", "2"}})),
      (Weights{{"A1B1C1", 1},
               {"A2B1C1", -1},
               {"A1B2C1", -1},
               {"A2B2C1", 1},
               {"A1B1C2", -1},
               {"A2B1C2", 1},
               {"A1B2C2", 1},
               {"A2B2C2", -1}}));
  const auto two = by_name(effect_weights(conditions, {{"A", "1", "2"}, {"C", "1", "2"}}));
  EXPECT_EQ(two.at("A1B2C1"), 0.5);
  EXPECT_EQ(two.at("A2B2C1"), -0.5);
  EXPECT_EQ(two.at("A2B1C2"), 0.5);
}

TEST(SignalContrast, LeavesOutOtherLevelsAndOtherFactors) {
  auto conditions = crossed(1);
  conditions.push_back({"A3", {{"A", "3"}}});
  conditions.push_back({"A1 again", {{"A", "1"}}});
  conditions.push_back({"rest", {}});
  EXPECT_EQ(by_name(effect_weights(conditions, {{"A", "1", "2"}})),
            (Weights{{"A1", 0.5}, {"A1 again", 0.5}, {"A2", -1}}));
}

TEST(SignalContrast, EffectiveTrialsAndNoiseByHand) {
  RandomStream random(1, "contrast");
  auto averages =
      noise_averages(random, 1e-6 * Eigen::MatrixXd::Identity(8, 8), {40, 10, 20}, 30, -0.08);
  const NoiseCovariance noise = estimate_noise(averages, {});
  const ContrastWaveform contrast = form_contrast(
      "c", {{"condition0", 1}, {"condition1", -0.5}, {"condition2", -0.5}}, averages, noise);
  // 1/40 + 0.25/10 + 0.25/20 = 0.0625
  EXPECT_NEAR(contrast.effective_trials, 16, 1e-12);
  EXPECT_TRUE(contrast.noise_V2.isApprox(noise.single_trial_V2 / 16, 1e-14));
  const Eigen::MatrixXd expected =
      averages[0].data_V - 0.5 * averages[1].data_V - 0.5 * averages[2].data_V;
  EXPECT_TRUE(contrast.data_V.isApprox(average_reference(8) * expected, 1e-14));
  // One condition named twice is still one average: (0.5 + 0.5)^2 / 40.
  const ContrastWaveform twice =
      form_contrast("t", {{"condition0", 0.5}, {"condition0", 0.5}}, averages, noise);
  EXPECT_NEAR(twice.effective_trials, 40, 1e-12);
}

TEST(SignalContrast, MeanOverParticipantsByHand) {
  RandomStream random(2, "mean contrast");
  std::vector<ContrastWaveform> contrasts;
  std::vector<NoiseCovariance> noise;
  for (const double trials : {40.0, 10.0}) {
    const auto averages =
        noise_averages(random, 1e-6 * Eigen::MatrixXd::Identity(8, 8), {trials}, 30, -0.08);
    noise.push_back(estimate_noise(averages, {}));
    contrasts.push_back(form_contrast("c", {{"condition0", 1}}, averages, noise.back()));
  }
  const ContrastWaveform mean = mean_contrast(contrasts, noise);
  const Eigen::MatrixXd covariance =
      (noise[0].single_trial_V2 / 40 + noise[1].single_trial_V2 / 10) / 4;
  EXPECT_TRUE(mean.noise_V2.isApprox(covariance, 1e-14));
  EXPECT_TRUE(mean.data_V.isApprox(0.5 * (contrasts[0].data_V + contrasts[1].data_V), 1e-14));
  EXPECT_NEAR(
      mean.effective_trials,
      0.5 * (noise[0].single_trial_V2 + noise[1].single_trial_V2).trace() / covariance.trace(),
      1e-9);
}

// Leaving a channel out and then forming the contrast must give what the mean over participants
// gives when one of them lacks the channel: the covariance of the rest does not depend on it.
TEST(SignalContrast, MeanKeepsCommonChannelsOnly) {
  RandomStream random(3, "common channels");
  const NoiseOptions plain{NoiseOptions::From::baseline, 0, 0, 0, {}, 0.0};
  const auto wide = noise_averages(random, 1e-6 * random.normal_matrix(9, 9), {12}, 80, -0.3);
  auto narrow = wide;
  narrow[0].channels.erase(narrow[0].channels.begin() + 4);
  narrow[0].data_V.middleRows(4, 4) = wide[0].data_V.middleRows(5, 4);
  narrow[0].data_V.conservativeResize(8, Eigen::NoChange);
  const std::vector<NoiseCovariance> noise{estimate_noise(narrow, plain),
                                           estimate_noise(wide, plain)};
  const ContrastWaveform alone = form_contrast("c", {{"condition0", 1}}, narrow, noise[0]);
  const ContrastWaveform mean =
      mean_contrast({alone, form_contrast("c", {{"condition0", 1}}, wide, noise[1])}, noise);
  EXPECT_EQ(mean.channels, narrow[0].channels);
  EXPECT_TRUE(mean.data_V.isApprox(alone.data_V, 1e-13));
  EXPECT_TRUE(mean.noise_V2.isApprox(alone.noise_V2 / 2, 1e-12));
  EXPECT_NEAR(mean.effective_trials, 24, 1e-9);
}

}  // namespace
}  // namespace headwater
