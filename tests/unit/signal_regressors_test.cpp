// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/random.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/regressors.hpp>

#include <fmt/core.h>
#include <gtest/gtest.h>

#include <cmath>
#include <numeric>

namespace headwater {
namespace {

constexpr double kEulerGamma = 0.57721566490153286061;

Table events(const std::vector<double>& values) {
  std::string text = "onset\tvalue\n";
  for (std::size_t i = 0; i < values.size(); ++i)
    text += fmt::format("{}\t{:.17g}\n", i, values[i]);
  return parse_table(text, "events.tsv");
}

std::vector<double> normals(std::size_t count) {
  RandomStream random(1, "observer");
  std::vector<double> values(count);
  for (double& value : values) value = random.normal();
  return values;
}

ObserverOptions standard_prior(double forgetting) {
  ObserverOptions options;
  options.value_column = "value";
  options.forgetting = forgetting;
  options.prior_mean = 0;
  options.prior_sd = 1;
  return options;
}

// By hand, prior (m, k, a, b) = (0, 1, 1, 1), nothing forgotten.
//   x = 2: t of 2 degrees about 0, scale^2 = 1*2/(1*1) = 2, z^2 = 4/2 = 2. The density of t_2 is
//     1/(2 sqrt2 (1+z^2/2)^(3/2)) = 1/(2 sqrt2 * 2 sqrt2) = 1/8; by the scale 1/(8 sqrt2): 7/2 bit.
//     Then m = (0+2)/2 = 1, k = 2, a = 3/2, b = 1 + 1*4/(2*2) = 2. Divergence:
//     psi(3/2)/2 - ln G(3/2) + ln 2 + 3/2 (1/2-1) + [ln 2 + 1/2 - 1 + 1*1*(3/2)/2]/2
//     = 3/8 - gamma/2 + 3/2 ln 2 - ln(pi)/2,  with psi(3/2) = 2 - gamma - 2 ln 2, G(3/2) =
//     sqrt(pi)/2
//   x = 0: t of 3 degrees about 1, scale^2 = 2*3/(3/2*2) = 2, z^2 = 1/2. The density of t_3 is
//     2/(pi sqrt3 (1+z^2/3)^2) = 2/(pi sqrt3 (7/6)^2) = 72/(49 pi sqrt3); by the scale
//     72/(49 pi sqrt6). Then m = (2*1+0)/3 = 2/3, k = 3, a = 2, b = 2 + 2*1/(2*3) = 7/3.
//     Divergence: psi(2)/2 - ln G(2) + ln G(3/2) + 3/2 ln(7/6) + 2 (6/7-1)
//     + [ln(3/2) + 2/3 - 1 + 2*(1/9)*2/(7/3)]/2
//     = 1/7 - gamma/2 + ln(sqrt(pi)/2) + 3/2 ln(7/6) + ln(3/2)/2,  with psi(2) = 1 - gamma
TEST(SignalRegressors, SequenceWorkedByHand) {
  const ObserverRegressors found = observe(events({2, 0}), standard_prior(1));
  const double tolerance = 1e-14;
  EXPECT_NEAR(found.surprise[0], 3.5, tolerance);
  EXPECT_NEAR(found.surprise[1], std::log2(49 * kPi * std::sqrt(6.0) / 72), tolerance);
  EXPECT_NEAR(found.prediction_error[0], 2, tolerance);
  EXPECT_NEAR(found.prediction_error[1], -1, tolerance);
  EXPECT_NEAR(found.absolute_error[1], 1, tolerance);
  EXPECT_NEAR(found.weighted_error[0], std::sqrt(2.0), tolerance);
  EXPECT_NEAR(found.weighted_error[1], std::sqrt(0.5), tolerance);
  EXPECT_NEAR(found.belief_update[0],
              3.0 / 8 - kEulerGamma / 2 + 1.5 * std::log(2.0) - 0.5 * std::log(kPi), tolerance);
  EXPECT_NEAR(found.belief_update[1],
              1.0 / 7 - kEulerGamma / 2 + std::log(std::sqrt(kPi) / 2) + 1.5 * std::log(7.0 / 6) +
                  0.5 * std::log(1.5),
              tolerance);
}

// As above with f = 1/2. After x = 2 the belief (1, 2, 3/2, 2) decays to k = 1/2*2 + 1/2*1 = 3/2,
// k m = 1/2*2*1 + 0 = 1, so m = 2/3, a = 1/2*3/2 + 1/2 = 5/4, b = 1/2*2 + 1/2 = 3/2; the next t has
// scale^2 = 3/2 * 5/2 / (5/4 * 3/2) = 2.
TEST(SignalRegressors, ForgettingWorkedByHand) {
  const ObserverRegressors found = observe(events({2, 0}), standard_prior(0.5));
  EXPECT_NEAR(found.surprise[0], 3.5, 1e-14);  // the prior decays to itself
  EXPECT_NEAR(found.prediction_error[1], -2.0 / 3, 1e-14);
  EXPECT_NEAR(found.weighted_error[1], std::sqrt(2.0) / 3, 1e-14);
}

// Without forgetting, one by one is the same as all at once: k = k0 + n, m = (k0 m0 + sum x)/k,
// a = a0 + n/2, b = b0 + sum (x - mean)^2 / 2 + k0 n (mean - m0)^2 / (2 k).
TEST(SignalRegressors, NothingForgottenIsTheBatchPosterior) {
  const NormalBelief prior{0.7, 2.5, 1.5, 3};
  const std::vector<double> values = normals(200);
  NormalBelief belief = prior;
  for (const double value : values) belief = update(decay(belief, prior, 1), value);
  const double n = 200, mean = std::accumulate(values.begin(), values.end(), 0.0) / n;
  double squares = 0;
  for (const double value : values) squares += (value - mean) * (value - mean);
  EXPECT_NEAR(belief.weight, 2.5 + n, 1e-11);
  EXPECT_NEAR(belief.mean, (2.5 * 0.7 + n * mean) / (2.5 + n), 1e-13);
  EXPECT_NEAR(belief.shape, 1.5 + n / 2, 1e-11);
  EXPECT_NEAR(belief.scale, 3 + squares / 2 + 2.5 * n * std::pow(mean - 0.7, 2) / (2 * (2.5 + n)),
              1e-11);
}

// k <- f k + (1-f) k0 + 1 settles at k0 + 1/(1-f): the prior, and a memory of 1/(1-f) values.
TEST(SignalRegressors, MemoryIsTheInverseOfWhatIsForgotten) {
  for (const double f : {0.5, 0.9, 0.98}) {
    const NormalBelief prior{0, 3, 2, 1};
    NormalBelief belief = prior;
    for (int i = 0; i < 3000; ++i) belief = update(decay(belief, prior, f), 1);
    EXPECT_NEAR(belief.weight, 3 + 1 / (1 - f), 1e-11) << f;
    EXPECT_NEAR(belief.shape, 2 + 0.5 / (1 - f), 1e-11) << f;
    EXPECT_NEAR(belief.mean, 1 / (1 - f) / (3 + 1 / (1 - f)), 1e-13) << f;
  }
}

TEST(SignalRegressors, ABlockStartsFromThePriorAndRowsWithoutValueChangeNothing) {
  const Table table = parse_table(
      "onset\tpitch\trun\tpart\n"
      "0\t3\t1\ta\n"
      "1\t1\t1\ta\n"
      "2\tn/a\tn/a\tn/a\n"  // a key press between the sounds: not a new block
      "3\t2\t1\ta\n"
      "4\t3\t1\tb\n"
      "5\t1\t1\tb\n"
      "6\t3\t2\tb\n",
      "events.tsv");
  ObserverOptions options = standard_prior(0.9);
  options.value_column = "pitch";
  options.block_columns = {"run", "part"};
  const ObserverRegressors found = observe(table, options);
  const ObserverRegressors alone = observe(events({3, 1, 2}), standard_prior(0.9));
  for (const std::string& name : observer_regressor_names()) {
    const Eigen::VectorXd &all = regressor(found, name), &block = regressor(alone, name);
    EXPECT_TRUE(std::isnan(all[2])) << name;
    const Eigen::Index same[][2] = {{0, 0}, {1, 1}, {3, 2}, {4, 0}, {5, 1}, {6, 0}};
    for (const auto& [row, place] : same) EXPECT_EQ(all[row], block[place]) << name << row;
  }
}

TEST(SignalRegressors, ThePriorComesFromAllValuesUnlessGiven) {
  ObserverOptions options;
  options.value_column = "value";
  options.prior_shape = 3;
  options.prior_weight = 2;
  const ObserverRegressors found = observe(events({1, 2, 6}), options);
  EXPECT_DOUBLE_EQ(found.prior.mean, 3);
  EXPECT_DOUBLE_EQ(found.prior.scale / found.prior.shape, (4 + 1 + 9) / 2.0);
  EXPECT_EQ(found.prior.weight, 2);
  EXPECT_EQ(found.prior.shape, 3);
  options.logarithm = true;
  EXPECT_NEAR(observe(events({1, 2, 6}), options).prior.mean, std::log(12.0) / 3, 1e-15);
  // Equal values are no trouble when the spread is known.
  options.prior_sd = 0.5;
  EXPECT_EQ(observe(events({2, 2}), options).prior.scale, 3 * 0.25);
}

// x -> c x + d with a prior taken from the values: errors are multiplied by c, surprise grows by
// log2 |c| (the unit has become so much smaller), the rest has no unit. Sizes up to 1e8 leave
// 1e-8 of the offset's rounding.
TEST(SignalRegressors, ScaleAndShiftOfTheValues) {
  const std::vector<double> values = normals(60);
  ObserverOptions options;
  options.value_column = "value";
  const ObserverRegressors before = observe(events(values), options);
  for (const auto& [scale, shift] :
       {std::pair{1000.0, 0.0}, {-2.5, 40.0}, {1e-8, 1.0}, {1e8, -3.0}, {1.0, 1e3}}) {
    std::vector<double> moved = values;
    for (double& value : moved) value = scale * value + shift;
    const ObserverRegressors after = observe(events(moved), options);
    const double tolerance = 1e-12 * (1 + std::abs(shift / scale));
    EXPECT_LT((after.prediction_error / scale - before.prediction_error).cwiseAbs().maxCoeff(),
              tolerance);
    EXPECT_LT((after.weighted_error - before.weighted_error).cwiseAbs().maxCoeff(), tolerance);
    EXPECT_LT((after.belief_update - before.belief_update).cwiseAbs().maxCoeff(), tolerance);
    EXPECT_LT((after.surprise - before.surprise)
                  .array()
                  .
                  operator-(std::log2(std::abs(scale)))
                  .abs()
                  .maxCoeff(),
              tolerance);
  }
}

}  // namespace
}  // namespace headwater
