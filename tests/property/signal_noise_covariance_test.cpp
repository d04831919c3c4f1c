// SPDX-License-Identifier: GPL-3.0-or-later
// Noise covariance against simulations of which the truth is known. Seeds are fixed; the bounds
// hold for any seed with the stated probability.
#include "reference/ledoit_wolf.hpp"
#include "signal_support.hpp"

#include <headwater/signal/noise_covariance.hpp>
#include <headwater/signal/reference.hpp>

#include <Eigen/Cholesky>
#include <Eigen/Eigenvalues>
#include <gtest/gtest.h>

#include <algorithm>

namespace headwater {
namespace {

using From = NoiseOptions::From;

Eigen::MatrixXd cholesky(const Eigen::MatrixXd& covariance) {
  return covariance.llt().matrixL();
}

/// Mean over many draws lies within 4.5 of its own standard errors of the truth, entry by entry:
/// for 15 entries a correct estimator fails for one seed in 10 000.
template <typename Draw>
void expect_unbiased(const Eigen::MatrixXd& truth, Draw&& draw) {
  constexpr int repeats = 1500;
  Eigen::ArrayXXd sum = Eigen::ArrayXXd::Zero(truth.rows(), truth.cols()), squares = sum;
  for (int i = 0; i < repeats; ++i) {
    const Eigen::ArrayXXd estimate = draw().array();
    sum += estimate;
    squares += estimate.square();
  }
  const Eigen::ArrayXXd mean = sum / repeats;
  const Eigen::ArrayXXd error = ((squares / repeats - mean.square()) / repeats).sqrt();
  EXPECT_LT(((mean - truth.array()).abs() / error).maxCoeff(), 4.5);
  EXPECT_LT((error / truth.diagonal().maxCoeff()).maxCoeff(), 0.01);  // so that a bias would show
}

TEST(SignalNoiseProperty, BaselineIsUnbiased) {
  const Eigen::MatrixXd covariance = invented_covariance(6), factor = cholesky(covariance);
  const Eigen::MatrixXd basis = reference_free_basis(6);
  RandomStream random(1, "baseline");
  const NoiseOptions options{From::baseline, -0.1, 0, 0, {}, 0.0};
  expect_unbiased(basis.transpose() * covariance * basis, [&] {
    auto averages = noise_averages(random, factor, {120, 30, 75}, 40, -0.1);
    for (Average& average : averages) {
      average.data_V.colwise() += 1e-5 * random.normal_matrix(6, 1).col(0);  // an offset, removed
      average.data_V.rightCols(14).array() += 1e-4;                          // outside the window
    }
    return estimate_noise(averages, options).single_trial_V2;
  });
}

TEST(SignalNoiseProperty, ResidualIsUnbiasedUnderSharedResponsesAndDrifts) {
  const Eigen::MatrixXd covariance = invented_covariance(6), factor = cholesky(covariance);
  const Eigen::MatrixXd basis = reference_free_basis(6);
  for (const std::vector<double>& trials :
       {std::vector<double>{120, 30, 75}, std::vector<double>{50}}) {
    RandomStream random(2, "residual");
    NoiseOptions options{From::residual, 0, 0, 0.4, {}, 0.0};
    expect_unbiased(basis.transpose() * covariance * basis, [&] {
      auto averages = noise_averages(random, factor, trials, 40, 0.35);
      const Eigen::MatrixXd shared = trials.size() > 1
                                         ? Eigen::MatrixXd(1e-5 * random.normal_matrix(6, 40))
                                         : Eigen::MatrixXd::Zero(6, 40);
      for (Average& average : averages)
        average.data_V +=
            shared + 1e-5 * random.normal_matrix(6, 1) * Eigen::RowVectorXd::LinSpaced(40, -1, 2);
      return estimate_noise(averages, options).single_trial_V2;
    });
  }
}

TEST(SignalNoiseProperty, CountsDegreesOfFreedom) {
  RandomStream random(3, "degrees");
  const auto averages =
      noise_averages(random, cholesky(invented_covariance(6)), {9, 4, 2}, 50, -0.1);
  EXPECT_EQ(estimate_noise(averages, {}).samples, 3 * (25 - 1));
  EXPECT_EQ(estimate_noise(averages, {From::residual, 0, 0, 0, {}, {}}).samples, 2 * (25 - 2));
  EXPECT_EQ(estimate_noise({averages[0]}, {From::residual, 0, 0, 0, {}, {}}).samples, 25 - 2);
  EXPECT_EQ(estimate_noise(averages, {From::baseline, -0.1, -0.08, 0, {}, {}}).samples,
            3 * (6 - 1));
}

// Source: the paper's formulas, see the twin. Both sum p n numbers: rounding grows at most like
// that.
TEST(SignalNoiseProperty, LedoitWolfWeightAgreesWithItsTwin) {
  RandomStream random(4, "twin");
  for (const auto& [p, n] : {std::pair{2, 3}, {5, 200}, {30, 25}, {63, 100}, {7, 1}}) {
    const Eigen::MatrixXd samples = cholesky(invented_covariance(p)) * random.normal_matrix(p, n);
    EXPECT_NEAR(ledoit_wolf_weight(samples, n, 1), reference::ledoit_wolf_weight(samples),
                1e-15 * p * n + 1e-14)
        << p << " by " << n;
  }
}

// The weight estimates the best one: E|S - C|^2 / E|S - m I|^2 (Ledoit & Wolf 2004, theorem 2.1),
// here for white samples after removal of a mean, so with divisor n - 1.
TEST(SignalNoiseProperty, LedoitWolfWeightIsNearTheBestOne) {
  const Eigen::Index p = 12, n = 40;
  const Eigen::MatrixXd covariance = invented_covariance(p), factor = cholesky(covariance);
  RandomStream random(5, "oracle");
  double weight = 0, error = 0, distance = 0;
  constexpr int repeats = 600;
  for (int i = 0; i < repeats; ++i) {
    Eigen::MatrixXd samples = factor * random.normal_matrix(p, n);
    samples.colwise() -= samples.rowwise().mean().eval();
    const Eigen::MatrixXd s = samples * samples.transpose() / static_cast<double>(n - 1);
    weight += ledoit_wolf_weight(samples, n - 1, 1) / repeats;
    error += (s - covariance).squaredNorm();
    distance += (s - covariance.trace() / p * Eigen::MatrixXd::Identity(p, p)).squaredNorm();
  }
  EXPECT_NEAR(weight / (error / distance), 1, 0.15);  // consistent as n grows; n is small here
}

/// Samples correlated in time: x_t = phi x_(t-1) + sqrt(1 - phi^2) e_t.
Eigen::MatrixXd autoregressive(RandomStream& random, Eigen::Index p, Eigen::Index n, double phi) {
  Eigen::MatrixXd x = random.normal_matrix(p, n);
  for (Eigen::Index t = 1; t < n; ++t)
    x.col(t) = phi * x.col(t - 1) + std::sqrt(1 - phi * phi) * x.col(t);
  return x;
}

// For the first-order process rho_k = phi^k, so tau tends to (1 + phi^2)/(1 - phi^2), and the
// variance of S is larger by that factor (Bartlett 1935 J R Stat Soc 98:536).
TEST(SignalNoiseProperty, CorrelatedSamplesCountForLess) {
  const double phi = 0.6, tau = (1 + phi * phi) / (1 - phi * phi);
  RandomStream random(6, "correlated");
  auto averages = noise_averages(random, Eigen::MatrixXd::Identity(20, 20), {4, 4, 4}, 400, -1.6);
  for (Average& average : averages) average.data_V = 1e-6 * autoregressive(random, 20, 400, phi);
  const NoiseCovariance noise = estimate_noise(averages, {});
  EXPECT_NEAR(static_cast<double>(noise.samples) / noise.independent_samples / tau, 1, 0.05);

  double white = 0, correlated = 0;
  constexpr int repeats = 400;
  for (int i = 0; i < repeats; ++i) {
    const Eigen::MatrixXd a = random.normal_matrix(6, 300), b = autoregressive(random, 6, 300, phi);
    const Eigen::MatrixXd one = Eigen::MatrixXd::Identity(6, 6);
    white += (a * a.transpose() / 300 - one).squaredNorm();
    correlated += (b * b.transpose() / 300 - one).squaredNorm();
  }
  EXPECT_NEAR(correlated / white / tau, 1, 0.1);
}

Eigen::VectorXd eigenvalues(const NoiseCovariance& noise) {
  return Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd>(noise.single_trial_V2).eigenvalues();
}

class SignalNoiseInvariance : public testing::TestWithParam<From> {
 protected:
  std::vector<Average> averages() {
    RandomStream random(7, "invariance");
    return noise_averages(random, cholesky(invented_covariance(16)), {80, 20, 50}, 60, -0.12);
  }
  NoiseOptions options() const { return {GetParam(), 0, 0, 0, {}, {}}; }
};

TEST_P(SignalNoiseInvariance, InputReferenceChangesNothing) {
  auto data = averages();
  const NoiseCovariance before = estimate_noise(data, options());
  RandomStream random(8, "reference");
  for (Average& average : data)
    average.data_V.rowwise() += 1e-4 * random.normal_matrix(1, average.data_V.cols()).row(0);
  const NoiseCovariance after = estimate_noise(data, options());
  // The added signal is up to 4e-4 V against noise of about 1e-6 V: 400 * eps of it is left.
  const double rounding = 1e-11;
  EXPECT_LT((after.single_trial_V2 - before.single_trial_V2).norm(),
            rounding * before.single_trial_V2.norm());
  EXPECT_NEAR(after.shrinkage, before.shrinkage, rounding);
  EXPECT_NEAR(after.independent_samples / before.independent_samples, 1, rounding);
}

TEST_P(SignalNoiseInvariance, ChannelOrderKeepsEigenvalues) {
  auto data = averages();
  const NoiseCovariance before = estimate_noise(data, options());
  for (Average& average : data) {
    average.data_V = average.data_V.colwise().reverse().eval();
    std::reverse(average.channels.begin(), average.channels.end());
  }
  const NoiseCovariance after = estimate_noise(data, options());
  EXPECT_LT((eigenvalues(after) - eigenvalues(before)).norm(), 1e-13 * eigenvalues(before).norm());
  EXPECT_NEAR(after.shrinkage, before.shrinkage, 1e-13);
  EXPECT_NEAR(after.condition / before.condition, 1, 1e-11);
}

TEST_P(SignalNoiseInvariance, ScalesWithTheSquareOfTheUnit) {
  const NoiseCovariance before = estimate_noise(averages(), options());
  for (const double scale : {1e-8, 1e8}) {
    auto data = averages();
    for (Average& average : data) average.data_V *= scale;
    const NoiseCovariance after = estimate_noise(data, options());
    EXPECT_LT((after.single_trial_V2 / (scale * scale) - before.single_trial_V2).norm(),
              1e-13 * before.single_trial_V2.norm());
    EXPECT_NEAR(after.shrinkage, before.shrinkage, 1e-13);
    EXPECT_EQ(after.rank, before.rank);
  }
}

INSTANTIATE_TEST_SUITE_P(Sources, SignalNoiseInvariance,
                         testing::Values(From::baseline, From::residual), [](const auto& tested) {
                           return tested.param == From::baseline ? "Baseline" : "Residual";
                         });

}  // namespace
}  // namespace headwater
