// SPDX-License-Identifier: GPL-3.0-or-later
#include "error_words.hpp"
#include "trial_support.hpp"

#include <headwater/base/error.hpp>
#include <headwater/signal/trial_covariance.hpp>

#include <gtest/gtest.h>

namespace headwater {
namespace {

class SignalTrialCovarianceFault : public testing::Test {
 protected:
  RandomStream random_{1, "covariance fault"};
  Trials trials(std::vector<int> numbers, Eigen::Index channels = 5, Eigen::Index samples = 10) {
    return noise_trials(random_, 1e-5 * random_.normal_matrix(channels, channels),
                        std::move(numbers), samples, -0.02);
  }
};

TEST_F(SignalTrialCovarianceFault, NoTrialOrOneOfEachCondition) {
  expect_error<InputError>([&] { estimate_trial_noise(trials({0, 0}), {}); }, {"no trial"});
  expect_error<InputError>([&] { trial_data_covariance(trials({0}), 0, 0.01); }, {"no trial"});
  expect_error<InputError>(
      [&] {
        estimate_trial_noise(trials({1, 1, 1}), {});
      },
      {"none of 3 conditions has two trials"});
}

TEST_F(SignalTrialCovarianceFault, WindowsWithoutSamples) {
  NoiseOptions options;
  options.baseline_from_s = 0.5;
  options.baseline_to_s = 0.6;
  expect_error<InputError>([&] { estimate_trial_noise(trials({5}), options); },
                           {"500 to 600 ms", "-20 to 16 ms"});
  expect_error<InputError>([&] { trial_data_covariance(trials({5}), 0.5, 0.6); },
                           {"500 to 600 ms"});
  Trials one = trials({5});
  one.baseline_removed = true;
  one.baseline_s = {-0.02, -0.02};
  expect_error<InputError>([&] { estimate_trial_noise(one, {}); }, {"one sample", "Widen"});
}

TEST_F(SignalTrialCovarianceFault, ASingularMatrixSaysItsRank) {
  NoiseOptions options;
  options.shrinkage = 0;
  // Two trials have one residual each, twice; at three samples that is rank 3 of 5 - 1.
  expect_error<InputError>([&] { estimate_trial_noise(trials({2}, 5, 3), options); },
                           {"singular", "rank 3 of 4", "5 channels", "shrinkage"});
  options.shrinkage.reset();
  EXPECT_NO_THROW(estimate_trial_noise(trials({2}, 5, 3), options));
  options.shrinkage = 1.5;
  expect_error<ExperimentError>([&] { estimate_trial_noise(trials({9}), options); },
                                {"shrinkage is 1.5"});
}

TEST_F(SignalTrialCovarianceFault, AveragesHoldNoSingleTrials) {
  const auto averages =
      noise_averages(random_, 1e-5 * random_.normal_matrix(5, 5), {10, 20}, 30, -0.06);
  NoiseOptions options;
  options.from = NoiseOptions::From::trials;
  expect_error<ExperimentError>([&] { estimate_noise(averages, options); },
                                {"single trials", "averages only"});
}

TEST_F(SignalTrialCovarianceFault, WhitenessOfWhatDoesNotBelongTogether) {
  const auto averages =
      noise_averages(random_, 1e-5 * random_.normal_matrix(6, 6), {10, 20}, 30, -0.06);
  const NoiseCovariance noise = estimate_trial_noise(trials({9, 9}), {});
  expect_error<InputError>([&] { check_whiteness(averages, noise, -0.06, 0); }, {"E6"});
  expect_error<InputError>([&] { check_whiteness({}, noise, -0.06, 0); }, {"no average"});
}

}  // namespace
}  // namespace headwater
