// SPDX-License-Identifier: GPL-3.0-or-later
#include "trial_support.hpp"

#include <headwater/base/distributions.hpp>
#include <headwater/base/error.hpp>
#include <headwater/signal/reference.hpp>
#include <headwater/signal/regression.hpp>

#include <Eigen/Cholesky>
#include <gtest/gtest.h>

#include <numeric>

namespace headwater {
namespace {

using Eigen::Index;
using Eigen::MatrixXd;

struct Case {
  Trials trials;
  MatrixXd values;
  std::vector<Regressor> regressors;
  explicit Case(std::vector<int> numbers = {40, 25}, Index columns = 2) {
    RandomStream random(1, "regression");
    trials = noise_trials(random, 1e-5 * random.normal_matrix(8, 8), std::move(numbers), 6, 0);
    values = random.normal_matrix(trials.count(), columns);
    give();
  }
  void give() {
    regressors.clear();
    for (Index j = 0; j < values.cols(); ++j)
      regressors.push_back({fmt::format("r{}", j), of_events(trials, values.col(j))});
  }
};

double largest(const MatrixXd& a) {
  return a.cwiseAbs().maxCoeff();
}

/// Sums over some tens of trials: rounding of a few eps, in units of the largest.
void expect_same(const std::vector<MatrixXd>& a, const std::vector<MatrixXd>& b,
                 double tolerance = 1e-13) {
  ASSERT_EQ(a.size(), b.size());
  for (std::size_t j = 0; j < a.size(); ++j)
    EXPECT_LT(largest(a[j] - b[j]), tolerance * largest(b[j])) << j;
}

TEST(SignalRegression, FindsPlantedSlopes) {
  Case work;
  RandomStream random(2, "slopes");
  const MatrixXd slopes[] = {1e-6 * random.normal_matrix(8, 6), 1e-7 * random.normal_matrix(8, 6)};
  const MatrixXd of_condition[] = {1e-5 * random.normal_matrix(8, 6),
                                   1e-5 * random.normal_matrix(8, 6)};
  for (const bool within : {true, false}) {
    // Conditions may differ only where they are told apart.
    for (Index k = 0; k < work.trials.count(); ++k)
      work.trials.data_V.middleCols(6 * k, 6) =
          of_condition[within ? work.trials.condition[static_cast<std::size_t>(k)] : 0] +
          work.values(k, 0) * slopes[0] + work.values(k, 1) * slopes[1];
    const RegressionResult found = regress(work.trials, work.regressors, {{}, within}, 0);
    for (std::size_t j = 0; j < 2; ++j) {
      const MatrixXd expected = average_reference(8) * slopes[j];
      EXPECT_LT(largest(found.beta_V[j] / found.deviation[static_cast<Index>(j)] - expected),
                1e-12 * 1e-5);
      // No noise: what is left is the rounding of residuals, of sums of squares a million times
      // eps of those of the responses at most.
      EXPECT_LT(largest(found.standard_error_V[j]), 1e-7 * 1e-5);
    }
    EXPECT_EQ(found.trials, 65);
    EXPECT_EQ(found.degrees, 65 - 2 - (within ? 2 : 1));
  }
}

TEST(SignalRegression, ChannelOrderReferenceAndScale) {
  const Case work;
  const RegressionResult before = regress(work.trials, work.regressors, {}, 0);
  const auto changed = [&](auto&& change) {
    Trials trials = work.trials;
    change(trials.data_V);
    return regress(trials, work.regressors, {}, 0);
  };
  const auto flipped = changed([](MatrixXd& data) { data = data.colwise().reverse().eval(); });
  const auto other = changed([](MatrixXd& data) { data.rowwise() -= data.row(3).eval(); });
  for (std::size_t j = 0; j < 2; ++j) {
    expect_same(
        {flipped.beta_V[j].colwise().reverse(), flipped.standard_error_V[j].colwise().reverse()},
        {before.beta_V[j], before.standard_error_V[j]});
    expect_same({other.beta_V[j], other.standard_error_V[j]},
                {before.beta_V[j], before.standard_error_V[j]});
    EXPECT_LT(largest(before.beta_V[j].colwise().sum()), 1e-14 * largest(before.beta_V[j]) * 8);
  }
  for (const double scale : {1e-8, 1e8}) {
    const auto scaled = changed([scale](MatrixXd& data) { data *= scale; });
    for (std::size_t j = 0; j < 2; ++j)
      expect_same({scaled.beta_V[j] / scale, scaled.standard_error_V[j] / scale},
                  {before.beta_V[j], before.standard_error_V[j]});
  }
}

TEST(SignalRegression, TheUnitOfARegressorDoesNotMatter) {
  Case work;
  const RegressionResult before = regress(work.trials, work.regressors, {}, 0);
  work.values.col(0) = 1e8 * work.values.col(0);
  work.values.col(1) = (-1e-8 * work.values.col(1)).array() + 1e-6;
  work.give();
  const RegressionResult after = regress(work.trials, work.regressors, {}, 0);
  // The offset of the second is a hundred times its spread.
  expect_same({after.beta_V[0], -after.beta_V[1]}, before.beta_V, 1e-12);
  EXPECT_NEAR(after.deviation[0] / before.deviation[0], 1e8, 1e-4);
  EXPECT_NEAR(after.mean[1], 1e-6 - 1e-8 * before.mean[1], 1e-18);
}

// What differs between conditions is a regressor's only where conditions are one group.
TEST(SignalRegression, DifferencesBetweenConditionsBelongToWhomeverTheUserSays) {
  Case work;
  for (Index k = 0; k < work.trials.count(); ++k)
    work.values(k, 0) +=
        3 * static_cast<double>(work.trials.condition[static_cast<std::size_t>(k)]);
  work.give();
  const RegressionResult in = regress(work.trials, work.regressors, {{}, true}, 0);
  const RegressionResult over = regress(work.trials, work.regressors, {{}, false}, 0);
  EXPECT_GT(over.deviation[0], 1.3 * in.deviation[0]);  // 1 against sqrt(1 + 9/4) at most
  Trials shifted = work.trials;
  for (Index k = 0; k < shifted.count(); ++k)
    shifted.data_V.middleCols(6 * k, 6).row(2).array() +=
        1e-5 * static_cast<double>(shifted.condition[static_cast<std::size_t>(k)]);
  const auto change = [&](bool within, const RegressionResult& before) {
    const RegressionResult after = regress(shifted, work.regressors, {{}, within}, 0);
    return largest(after.beta_V[0] - before.beta_V[0]);
  };
  EXPECT_LT(change(true, in), 1e-18);
  EXPECT_GT(change(false, over), 1e-6);
}

TEST(SignalRegression, UsesTheConditionsAskedForAndTrialsWithValues) {
  Case work({30, 20, 12}, 1);
  work.values(7, 0) = work.values(8, 0) = std::nan("");
  work.give();
  std::vector<Index> places;
  for (Index k = 0; k < work.trials.count(); ++k)
    if (work.trials.condition[static_cast<std::size_t>(k)] != 1 && k != 7 && k != 8)
      places.push_back(k);
  const RegressionOptions options{{"condition2", "condition0"}, true};
  const RegressionResult found = regress(work.trials, work.regressors, options, 0);
  const RegressionResult expected =
      regress(pick_trials(work.trials, places), work.regressors, {}, 0);
  expect_same(found.beta_V, expected.beta_V, 1e-15);
  EXPECT_EQ(found.trials, static_cast<Index>(places.size()));
  ASSERT_EQ(found.notes.size(), 1u);
  EXPECT_NE(found.notes[0].find("'r0'"), std::string::npos);
}

TEST(SignalRegression, SaysWhenRegressorsShareMostOfWhatTheyHold) {
  Case work;
  work.values.col(1) = work.values.col(0) + 0.3 * work.values.col(1);
  work.give();
  const RegressionResult found = regress(work.trials, work.regressors, {}, 0);
  EXPECT_GT(found.inflation.minCoeff(), 5);
  ASSERT_EQ(found.notes.size(), 2u);
  EXPECT_NE(found.notes[1].find("variance inflation"), std::string::npos);
}

// Left out from sums, and fitted afresh without the trials: the same slopes. The second regressor
// is given in multiples of the first fit's deviation.
TEST(SignalRegression, ABlockLeftOutIsARefit) {
  for (const bool within : {true, false})
    for (const int blocks : {2, 3, 10, 65}) {
      const Case work;
      const RegressionResult found = regress(work.trials, work.regressors, {{}, within}, blocks);
      ASSERT_EQ(found.without_block.size(), static_cast<std::size_t>(blocks));
      for (Index b = 0; b < blocks; ++b) {
        const Index n = work.trials.count(), first = b * n / blocks, last = (b + 1) * n / blocks;
        std::vector<Index> places;
        for (Index k = 0; k < n; ++k)
          if (k < first || k >= last) places.push_back(k);
        const RegressionResult refit =
            regress(pick_trials(work.trials, places), work.regressors, {{}, within}, 0);
        std::vector<MatrixXd> expected;
        for (Index j = 0; j < 2; ++j)
          expected.push_back(refit.beta_V[static_cast<std::size_t>(j)] *
                             (found.deviation[j] / refit.deviation[j]));
        expect_same(found.without_block[static_cast<std::size_t>(b)], expected, 1e-12);
      }
    }
}

TEST(SignalRegression, ABlockMayHoldAllTrialsOfACondition) {
  Case work({30, 30, 15}, 2);
  // In turns until two are used up would spread them: put the third condition last instead.
  std::vector<Index> order;
  for (const std::size_t wanted : {0u, 1u, 2u})
    for (Index k = 0; k < work.trials.count(); ++k)
      if (work.trials.condition[static_cast<std::size_t>(k)] == wanted) order.push_back(k);
  const Trials sorted = pick_trials(work.trials, order);
  const RegressionResult found = regress(sorted, work.regressors, {}, 5);
  std::vector<Index> first_sixty(60);
  std::iota(first_sixty.begin(), first_sixty.end(), Index{0});
  const RegressionResult refit = regress(pick_trials(sorted, first_sixty), work.regressors, {}, 0);
  for (Index j = 0; j < 2; ++j)
    expect_same(
        {found.without_block[4][static_cast<std::size_t>(j)]},
        {refit.beta_V[static_cast<std::size_t>(j)] * (found.deviation[j] / refit.deviation[j])},
        1e-12);
}

// beta / standard error is Student's t of 40 - 2 - 2 = 36 degrees where there is no effect: beyond
// its 97.5 % point 2.0281 (Abramowitz & Stegun 1964, table 26.10, interpolated 2.028) in 5 % of
// cases. Trials are independent over simulations; 8 channels at one sample are not, so each
// simulation counts once: 1200 of them give 60 +- 4.5 sqrt(57).
TEST(SignalRegression, StandardErrorsCoverTheTruth) {
  RandomStream random(3, "coverage");
  const MatrixXd factor = 1e-5 * random.normal_matrix(4, 4);
  constexpr int repeats = 1200;
  int beyond = 0;
  double squares = 0;
  for (int i = 0; i < repeats; ++i) {
    Trials trials = noise_trials(random, factor, {25, 15}, 1, 0);
    const MatrixXd values = random.normal_matrix(40, 2);
    const RegressionResult found = regress(
        trials, {{"a", of_events(trials, values.col(0))}, {"b", of_events(trials, values.col(1))}},
        {}, 0);
    const double t = found.beta_V[0](1, 0) / found.standard_error_V[0](1, 0);
    beyond += std::abs(t) > 2.0281;
    squares += t * t;
  }
  EXPECT_NEAR(beyond, 0.05 * repeats, 4.5 * std::sqrt(0.05 * 0.95 * repeats));
  // E t^2 = nu/(nu-2); its variance is 2 nu^2 (nu-1) / ((nu-2)^2 (nu-4)) = F(1, nu)'s.
  const double nu = 36, mean = nu / (nu - 2),
               sd = std::sqrt(2 * nu * nu * (nu - 1) / ((nu - 2) * (nu - 2) * (nu - 4)));
  EXPECT_NEAR(squares / repeats, mean, 4.5 * sd / std::sqrt(repeats));
}

// The contrast's covariance is that of the coefficients over repetitions of the noise.
TEST(SignalRegression, ACoefficientIsAContrastWithItsCovariance) {
  RandomStream random(4, "contrast");
  const MatrixXd factor = invented_covariance(4).llt().matrixL();
  Trials trials = noise_trials(random, factor, {20, 12}, 1, 0);
  const MatrixXd values = random.normal_matrix(32, 2);
  const std::vector<Regressor> regressors{{"a", of_events(trials, values.col(0))},
                                          {"b", of_events(trials, values.col(1))}};
  NoiseCovariance noise;
  noise.channels = trials.channels;
  const MatrixXd basis = reference_free_basis(4);
  noise.single_trial_V2 = basis.transpose() * factor * factor.transpose() * basis;
  constexpr int repeats = 4000;
  MatrixXd sum = MatrixXd::Zero(3, 3);
  ContrastWaveform contrast;
  for (int i = 0; i < repeats; ++i) {
    trials.data_V = factor * random.normal_matrix(4, 32);
    const RegressionResult found = regress(trials, regressors, {}, 0);
    contrast = coefficient_contrast("b", found, 1, trials, noise);
    const Eigen::VectorXd y = basis.transpose() * contrast.data_V;
    sum += y * y.transpose() / repeats;
    ASSERT_EQ(contrast.data_V, found.beta_V[1]);
  }
  // Wishart: the entry ij has variance (C_ij^2 + C_ii C_jj) / repeats.
  const MatrixXd& c = contrast.noise_V2;
  for (Index i = 0; i < 3; ++i)
    for (Index j = 0; j < 3; ++j)
      EXPECT_NEAR(sum(i, j), c(i, j),
                  4.5 * std::sqrt((c(i, j) * c(i, j) + c(i, i) * c(j, j)) / repeats));
  EXPECT_EQ(contrast.name, "b");
  EXPECT_EQ(contrast.channels, trials.channels);
}

}  // namespace
}  // namespace headwater
