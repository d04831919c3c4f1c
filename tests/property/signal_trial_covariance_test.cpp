// SPDX-License-Identifier: GPL-3.0-or-later
// Covariances from trials against simulations of which the truth is known. Seeds are fixed; the
// bounds hold for any seed with the stated probability.
#include "reference/ledoit_wolf.hpp"
#include "reference/trial_covariance.hpp"
#include "trial_support.hpp"

#include <headwater/base/distributions.hpp>
#include <headwater/signal/reference.hpp>
#include <headwater/signal/trial_covariance.hpp>

#include <Eigen/Cholesky>
#include <Eigen/Eigenvalues>
#include <gtest/gtest.h>

namespace headwater {
namespace {

using Eigen::Index;
using Eigen::MatrixXd;

constexpr Index kBaseline = 15;  ///< samples before 0 of trials that begin at -60 ms

MatrixXd factor_of(Index channels) {
  return invented_covariance(channels).llt().matrixL();
}

/// Correlation exp(-(lag/width)^2 / 2) between samples: smooth, as signals are that have been
/// through a low-pass.
MatrixXd smooth_correlation(Index samples, double width) {
  MatrixXd rho(samples, samples);
  for (Index i = 0; i < samples; ++i)
    for (Index j = 0; j < samples; ++j) rho(i, j) = std::exp(-0.5 * std::pow((i - j) / width, 2));
  rho.diagonal().array() += 1e-9;  // positive definite in spite of rounding
  return rho;
}

/// Gives each trial's samples a correlation in time (its Cholesky factor).
void make_smooth(Trials& trials, const MatrixXd& time_factor) {
  const Index samples = trials.times_s.size();
  for (Index k = 0; k < trials.count(); ++k)
    trials.data_V.middleCols(k * samples, samples) =
        trials.trial(k).eval() * time_factor.transpose();
}

void remove_baseline(Trials& trials) {
  const Index samples = trials.times_s.size();
  for (Index k = 0; k < trials.count(); ++k) {
    auto trial = trials.data_V.middleCols(k * samples, samples);
    trial.colwise() -= trial.leftCols(kBaseline).rowwise().mean().eval();
  }
  trials.baseline_removed = true;
  trials.baseline_s = {trials.times_s[0], trials.times_s[kBaseline - 1]};
}

NoiseOptions no_shrinkage() {
  NoiseOptions options;
  options.from = NoiseOptions::From::trials;
  options.shrinkage = 0;
  return options;
}

/// Mean over many draws lies within 4.5 of its own standard errors of the truth, entry by entry.
template <typename Draw>
void expect_mean(const MatrixXd& truth, Draw&& draw) {
  constexpr int repeats = 400;
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

struct NoiseCase {
  const char* name;
  bool smooth, baseline;
};

class SignalTrialNoise : public testing::TestWithParam<NoiseCase> {};

// Residuals about a condition's mean, so responses do not matter. What each trial's own mean over
// the baseline takes away is (1/T) of the variance where samples are independent, tau_1/T with
// tau_1 = sum_st rho(s-t)/T where not; then the estimate's mean is C (T - tau_1)/(T - 1).
TEST_P(SignalTrialNoise, MeanOfTheEstimate) {
  const MatrixXd basis = reference_free_basis(5);
  const MatrixXd truth = basis.transpose() * invented_covariance(5) * basis;
  const MatrixXd rho = smooth_correlation(24, 2.5), time_factor = rho.llt().matrixL();
  RandomStream random(1, "trial noise");
  const MatrixXd response = 1e-4 * random.normal_matrix(5, 24);
  double share = 1;
  if (GetParam().smooth && GetParam().baseline) {
    const double tau = rho.topLeftCorner(kBaseline, kBaseline).sum() / kBaseline;
    share = (kBaseline - tau) / (kBaseline - 1);
    EXPECT_LT(share, 0.7);  // the case is a case
  }
  expect_mean(share * truth, [&] {
    Trials trials = noise_trials(random, factor_of(5), {12, 5, 1}, 24, -0.06);
    if (GetParam().smooth) make_smooth(trials, time_factor);
    for (Index k = 0; k < trials.count(); ++k)
      trials.data_V.middleCols(24 * k, 24) +=
          response * static_cast<double>(trials.condition[static_cast<std::size_t>(k)]);
    if (GetParam().baseline) remove_baseline(trials);
    return estimate_trial_noise(trials, no_shrinkage()).single_trial_V2;
  });
}

INSTANTIATE_TEST_SUITE_P(Kinds, SignalTrialNoise,
                         testing::Values(NoiseCase{"White", false, false},
                                         NoiseCase{"WhiteBaseline", false, true},
                                         NoiseCase{"Smooth", true, false},
                                         NoiseCase{"SmoothBaseline", true, true}),
                         [](const auto& tested) { return tested.param.name; });

TEST(SignalTrialCovariance, EqualsItsPlainTwin) {
  RandomStream random(2, "twin");
  Trials trials = noise_trials(random, factor_of(7), {9, 4, 1, 6}, 24, -0.06);
  trials.data_V.row(3).array() += 1e-3;  // an offset is in the means
  const MatrixXd basis = reference_free_basis(7);
  const auto twin = [&](Index first, Index count, double degrees) {
    return MatrixXd(basis.transpose() * reference::pooled_residuals(trials, first, count, degrees) *
                    basis);
  };
  // 1e-3 V among 1e-5 V: a hundred eps of each value, and less of the sums.
  const double tolerance = 1e-12;
  NoiseOptions options = no_shrinkage();
  const NoiseCovariance all = estimate_trial_noise(trials, options);
  EXPECT_EQ(all.samples, (8 + 3 + 5) * 24);
  EXPECT_TRUE(all.single_trial_V2.isApprox(twin(0, 24, 16 * 24), tolerance));
  remove_baseline(trials);
  const NoiseCovariance baseline = estimate_trial_noise(trials, options);
  EXPECT_EQ(baseline.samples, 16 * (kBaseline - 1));
  EXPECT_TRUE(
      baseline.single_trial_V2.isApprox(twin(0, kBaseline, 16 * (kBaseline - 1)), tolerance));
  // Samples other than those of which the mean was removed keep all degrees.
  options.baseline_from_s = 0;
  options.baseline_to_s = 0.02;
  const NoiseCovariance later = estimate_trial_noise(trials, options);
  EXPECT_EQ(later.samples, 16 * 6);
  EXPECT_TRUE(later.single_trial_V2.isApprox(twin(15, 6, 16 * 6), tolerance));
}

TEST(SignalTrialCovariance, ShrinksByLedoitWolfOrOasOrAsTold) {
  RandomStream random(3, "shrinkage");
  const Trials trials = noise_trials(random, factor_of(12), {3, 2}, 10, 0);
  NoiseOptions options = no_shrinkage();
  const NoiseCovariance plain = estimate_trial_noise(trials, options);
  // The residuals as a matrix, p by 50, for the published formula: of 30 independent columns, and
  // scaled so that their mean product is the estimate.
  MatrixXd residuals(11, 50);
  const MatrixXd basis = reference_free_basis(12);
  for (Index k = 0; k < 5; ++k) {
    const auto of = [&](Index i) { return trials.condition[static_cast<std::size_t>(i)]; };
    MatrixXd mean = MatrixXd::Zero(12, 10);
    for (Index i = 0; i < 5; ++i)
      if (of(i) == of(k)) mean += trials.trial(i) / (of(k) == 0 ? 3 : 2);
    residuals.middleCols(10 * k, 10) = basis.transpose() * (trials.trial(k) - mean);
  }
  const double tau = static_cast<double>(plain.samples) / plain.independent_samples;
  EXPECT_EQ(plain.samples, 30);
  options.shrinkage.reset();
  const NoiseCovariance ledoit = estimate_trial_noise(trials, options);
  EXPECT_NEAR(ledoit.shrinkage, ledoit_wolf_weight(residuals, 30, tau), 1e-13);
  options.oas = true;
  const NoiseCovariance oas = estimate_trial_noise(trials, options);
  EXPECT_EQ(oas.shrinkage, oas_weight(plain.single_trial_V2, plain.independent_samples));
  EXPECT_GT(oas.shrinkage, 0.01);
  EXPECT_LT(oas.shrinkage, 1);
  EXPECT_NEAR(oas.single_trial_V2.trace() / plain.single_trial_V2.trace(), 1, 1e-14);
}

TEST(SignalTrialCovariance, ReferenceOrderAndScale) {
  RandomStream random(4, "invariance");
  const Trials trials = noise_trials(random, factor_of(8), {10, 8}, 20, -0.06);
  const NoiseOptions options;
  const NoiseCovariance before = estimate_trial_noise(trials, options);
  const MatrixXd data = trial_data_covariance(trials, 0, 0.01);
  Trials other = trials;
  other.data_V.rowwise() += 1e-4 * random.normal_matrix(1, other.data_V.cols()).row(0);
  // Up to 4e-4 V added to 1e-5 V: 40 eps of it is left.
  EXPECT_TRUE(
      estimate_trial_noise(other, options).single_trial_V2.isApprox(before.single_trial_V2, 1e-12));
  EXPECT_TRUE(trial_data_covariance(other, 0, 0.01).isApprox(data, 1e-12));
  other.data_V = trials.data_V.colwise().reverse();
  const auto eigenvalues = [](const MatrixXd& a) {
    return Eigen::SelfAdjointEigenSolver<MatrixXd>(a).eigenvalues();
  };
  EXPECT_TRUE(eigenvalues(estimate_trial_noise(other, options).single_trial_V2)
                  .isApprox(eigenvalues(before.single_trial_V2), 1e-12));
  for (const double scale : {1e-8, 1e8}) {
    other.data_V = scale * trials.data_V;
    const NoiseCovariance after = estimate_trial_noise(other, options);
    EXPECT_TRUE((after.single_trial_V2 / (scale * scale)).isApprox(before.single_trial_V2, 1e-13));
    EXPECT_NEAR(after.shrinkage, before.shrinkage, 1e-13);
    EXPECT_TRUE((trial_data_covariance(other, 0, 0.01) / (scale * scale)).isApprox(data, 1e-13));
  }
}

TEST(SignalTrialCovariance, DataAreAboutZero) {
  RandomStream random(5, "data");
  Trials trials = noise_trials(random, factor_of(6), {3, 4}, 8, 0);
  const MatrixXd basis = reference_free_basis(6);
  MatrixXd expected = MatrixXd::Zero(5, 5);
  for (Index k = 0; k < 7; ++k)
    for (Index t = 2; t <= 5; ++t) {
      const Eigen::VectorXd y = basis.transpose() * trials.trial(k).col(t);
      expected += y * y.transpose() / (7 * 4);
    }
  EXPECT_TRUE(trial_data_covariance(trials, 0.008, 0.02).isApprox(expected, 1e-13));
}

// Chen et al. 2010, eq. (23), as printed, with matrix products written out.
TEST(SignalTrialCovariance, OasWeightIsThePrintedFormula) {
  RandomStream random(6, "oas");
  for (const auto& [p, n] : {std::pair{4, 50}, {30, 10}, {63, 200}}) {
    const MatrixXd x = factor_of(p) * random.normal_matrix(p, n);
    const MatrixXd s = x * x.transpose() / n;
    const double square_trace = (s * s).trace(), trace_square = s.trace() * s.trace();
    const double rho = std::min(1.0, ((1 - 2.0 / p) * square_trace + trace_square) /
                                         ((n + 1 - 2.0 / p) * (square_trace - trace_square / p)));
    EXPECT_NEAR(oas_weight(s, n), rho, 1e-13);
  }
  EXPECT_EQ(oas_weight(MatrixXd::Identity(9, 9), 1e6), 1);
}

// Chen et al. 2010, section IV (their figures 1 to 4): for few samples the weight is near 1 where
// the truth is spherical, it falls as samples are added where it is not, and the shrunk matrix has
// a smaller mean square error than S.
TEST(SignalTrialCovariance, OasBehavesAsPublished) {
  RandomStream random(7, "oas behaviour");
  const Index p = 20;
  const MatrixXd covariance = 1e10 * invented_covariance(p), factor = covariance.llt().matrixL();
  double last = 1;
  for (const Index n : {Index{6}, Index{20}, Index{100}, Index{2000}}) {
    double weight = 0, spherical = 0, shrunk_error = 0, plain_error = 0;
    constexpr int repeats = 60;
    for (int i = 0; i < repeats; ++i) {
      const MatrixXd z = random.normal_matrix(p, n), x = factor * z;
      const MatrixXd s = x * x.transpose() / static_cast<double>(n);
      spherical +=
          oas_weight(z * z.transpose() / static_cast<double>(n), static_cast<double>(n)) / repeats;
      const double rho = oas_weight(s, static_cast<double>(n));
      weight += rho / repeats;
      MatrixXd shrunk = (1 - rho) * s;
      shrunk.diagonal().array() += rho * s.trace() / static_cast<double>(p);
      shrunk_error += (shrunk - covariance).squaredNorm();
      plain_error += (s - covariance).squaredNorm();
    }
    EXPECT_GT(spherical, 0.9) << n;
    EXPECT_LT(weight, last) << n;
    if (n < 100) {
      EXPECT_LT(shrunk_error, plain_error) << n;
    }
    last = weight;
  }
  EXPECT_LT(last, 0.02);
}

TEST(SignalTrialCovariance, AveragesCanBeShrunkByOas) {
  RandomStream random(8, "averages");
  const auto averages = noise_averages(random, factor_of(10), {20, 30}, 40, -0.08);
  NoiseOptions options;
  options.shrinkage = 0;
  const NoiseCovariance plain = estimate_noise(averages, options);
  options.shrinkage.reset();
  options.oas = true;
  EXPECT_EQ(estimate_noise(averages, options).shrinkage,
            oas_weight(plain.single_trial_V2, plain.independent_samples));
}

// --- whiteness

/// Average of each condition.
std::vector<Average> averages_of(const Trials& trials) {
  std::vector<Average> averages;
  for (std::size_t c = 0; c < trials.conditions.size(); ++c) {
    Average average{trials.conditions[c], trials.channels, trials.times_s,
                    MatrixXd::Zero(trials.data_V.rows(), trials.times_s.size()), 0};
    for (Index k = 0; k < trials.count(); ++k) {
      if (trials.condition[static_cast<std::size_t>(k)] != c) continue;
      average.data_V += trials.trial(k);
      ++average.trials;
    }
    average.data_V /= average.trials;
    averages.push_back(average);
  }
  return averages;
}

struct WhiteCase {
  const char* name;
  bool smooth, baseline;
  bool known;  ///< the true covariance, not one estimated from the trials
  Index channels;
  std::vector<int> numbers;
};

class SignalWhiteness : public testing::TestWithParam<WhiteCase> {};

// 95 % of seeds inside: 300 of them give 285 +- 4.5 sqrt(300 * 0.95 * 0.05) = 285 +- 17. The range
// rests on a tau estimated from the baseline itself and, where the covariance is estimated, on a
// limit of many channels: it is approximate, and these cases show by how little.
TEST_P(SignalWhiteness, CoversTheTruthAsOftenAsStated) {
  const WhiteCase& given = GetParam();
  const MatrixXd factor = factor_of(given.channels), basis = reference_free_basis(given.channels);
  const MatrixXd time_factor = smooth_correlation(24, 1.0).llt().matrixL();
  RandomStream random(9, given.name);
  constexpr int repeats = 300;
  int white = 0;
  double mean = 0, middle = 0;
  for (int i = 0; i < repeats; ++i) {
    Trials trials = noise_trials(random, factor, given.numbers, 24, -0.06);
    if (given.smooth) make_smooth(trials, time_factor);
    if (given.baseline) remove_baseline(trials);
    NoiseCovariance noise;
    noise.channels = trials.channels;
    if (given.known)
      noise.single_trial_V2 = basis.transpose() * factor * factor.transpose() * basis;
    else
      noise = estimate_trial_noise(trials, {});
    const Whiteness found = check_whiteness(averages_of(trials), noise, -0.06, -0.004);
    white += found.white;
    mean += found.mean_square / repeats;
    middle += 0.5 * (found.low + found.high) / repeats;
    EXPECT_GT(found.largest, found.mean_square);
  }
  EXPECT_NEAR(white, 0.95 * repeats, 17) << mean << " where " << middle << " is expected";
}

INSTANTIATE_TEST_SUITE_P(
    Kinds, SignalWhiteness,
    testing::Values(WhiteCase{"Known", false, false, true, 6, {5, 9}},
                    WhiteCase{"KnownBaseline", false, true, true, 6, {5, 9}},
                    WhiteCase{"Smooth", true, false, true, 6, {5, 9}},
                    WhiteCase{"Estimated", false, true, false, 6, {50, 30}},
                    WhiteCase{"EstimatedSmooth", true, true, false, 6, {50, 30}},
                    WhiteCase{"ManyChannels", false, true, false, 40, {20, 10}},
                    WhiteCase{"ManyChannelsSmooth", true, true, false, 40, {20, 10}}),
    [](const auto& tested) { return tested.param.name; });

class SignalWhitenessFound : public testing::Test {
 protected:
  Whiteness check(double line_V, double factor) {
    RandomStream random(10, "line");
    Trials trials = noise_trials(random, factor_of(16), {60, 80}, 24, -0.06);
    const Eigen::VectorXd pattern = random.normal_matrix(16, 1).col(0);
    for (Index k = 0; k < trials.count(); ++k)
      for (Index t = 0; t < 24; ++t)  // 50 Hz in step with the events
        trials.data_V.col(24 * k + t) +=
            line_V * std::sin(2 * 3.14159 * 50 * trials.times_s[t]) * pattern;
    remove_baseline(trials);
    NoiseCovariance noise = estimate_trial_noise(trials, {});
    noise.single_trial_V2 *= factor;
    return check_whiteness(averages_of(trials), noise, -0.06, -0.004);
  }
};

TEST_F(SignalWhitenessFound, NoiseThatIsLockedToTheEvents) {
  EXPECT_TRUE(check(0, 1).white);
  const Whiteness line = check(3e-6, 1);
  EXPECT_FALSE(line.white);
  EXPECT_GT(line.mean_square, line.high);
  EXPECT_GT(line.largest, 3 * check(0, 1).largest);
}

TEST_F(SignalWhitenessFound, ACovarianceTwiceTooLargeOrHalf) {
  const double right = check(0, 1).mean_square;
  const Whiteness large = check(0, 2), small = check(0, 0.5);
  EXPECT_LT(large.mean_square, large.low);
  EXPECT_FALSE(large.white);
  EXPECT_NEAR(large.mean_square, 0.5 * right, 1e-12);
  EXPECT_GT(small.mean_square, small.high);
  EXPECT_FALSE(small.white);
}

TEST_F(SignalWhitenessFound, WithoutABaselineNothingIsSaid) {
  RandomStream random(11, "none");
  const Trials trials = noise_trials(random, factor_of(5), {9, 9}, 10, 0);
  const NoiseCovariance noise = estimate_trial_noise(trials, {});
  const Whiteness found = check_whiteness(averages_of(trials), noise, -0.1, -0.004);
  EXPECT_TRUE(std::isnan(found.mean_square));
  EXPECT_TRUE(found.white);
}

}  // namespace
}  // namespace headwater
