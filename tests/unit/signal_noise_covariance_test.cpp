// SPDX-License-Identifier: GPL-3.0-or-later
#include "base_scratch.hpp"
#include "signal_support.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/table.hpp>
#include <headwater/signal/noise_covariance.hpp>
#include <headwater/signal/reference.hpp>

#include <gtest/gtest.h>

namespace headwater {
namespace {

TEST(SignalNoise, ReadsATableByName) {
  const Scratch scratch;
  const Eigen::MatrixXd covariance = invented_covariance(9);
  const Labels names = numbered_channels(9);
  Labels columns{"name"};
  columns.insert(columns.end(), names.begin(), names.end());
  const auto path = scratch.folder / "noise.tsv";
  write_file(path, number_table_text(columns, names, 1e12 * covariance, 17));
  const Labels wanted{"e9", "E2", "E4", "E1"};  // other order, other case, some left out
  const NoiseCovariance noise = read_noise_table(path, wanted, {});
  Eigen::MatrixXd picked(4, 4);
  const int order[] = {8, 1, 3, 0};
  for (int i = 0; i < 4; ++i)
    for (int j = 0; j < 4; ++j) picked(i, j) = covariance(order[i], order[j]);
  const Eigen::MatrixXd basis = reference_free_basis(4);
  EXPECT_TRUE(noise.single_trial_V2.isApprox(basis.transpose() * picked * basis, 1e-14));
  EXPECT_EQ(noise.channels, wanted);
  EXPECT_EQ(noise.shrinkage, 0);
  EXPECT_EQ(noise.rank, 3);
}

TEST(SignalNoise, ShrinksByTheWeightGiven) {
  RandomStream random(1, "shrinkage");
  const auto averages = noise_averages(random, 1e-6 * random.normal_matrix(8, 8), {25}, 200, -0.5);
  NoiseOptions options;
  options.shrinkage = 0;
  const NoiseCovariance plain = estimate_noise(averages, options);
  options.shrinkage = 0.25;
  const NoiseCovariance shrunk = estimate_noise(averages, options);
  const double mean = plain.single_trial_V2.trace() / 7;
  EXPECT_TRUE(shrunk.single_trial_V2.isApprox(
      0.75 * plain.single_trial_V2 + 0.25 * mean * Eigen::MatrixXd::Identity(7, 7), 1e-14));
  EXPECT_LT(shrunk.condition, plain.condition);
  EXPECT_NEAR(shrunk.single_trial_V2.trace() / plain.single_trial_V2.trace(), 1, 1e-14);
}

TEST(SignalNoise, FewerSamplesThanChannelsAreLegal) {
  RandomStream random(2, "few samples");
  const auto averages =
      noise_averages(random, 1e-6 * Eigen::MatrixXd::Identity(32, 32), {25}, 20, -0.04);
  const NoiseCovariance noise = estimate_noise(averages, {});
  EXPECT_EQ(noise.samples, 9);
  EXPECT_EQ(noise.rank, 9);  // ten samples less their mean
  EXPECT_GT(noise.shrinkage, 0.2);
  EXPECT_LT(noise.condition, 100);
}

}  // namespace
}  // namespace headwater
