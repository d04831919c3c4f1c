// SPDX-License-Identifier: GPL-3.0-or-later
// Regression against normal equations in extended precision, the design written out in full.
#include "reference/regression.hpp"
#include "trial_support.hpp"

#include <headwater/signal/regression.hpp>

#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

using Eigen::Index;
using Wide = std::vector<std::vector<long double>>;

/// Trials with an offset that dwarfs them, and three regressors with means and sizes of all kinds.
struct Case {
  Trials trials;
  std::vector<Regressor> regressors;
  Eigen::MatrixXd values;  ///< n by 3
  explicit Case(double offset_V = 0) {
    RandomStream random(1, "regression twin");
    trials = noise_trials(random, 1e-5 * random.normal_matrix(7, 7), {31, 17, 24}, 9, -0.01);
    trials.data_V.array() += 1e-5;
    trials.data_V.row(2).array() += offset_V;
    values = random.normal_matrix(trials.count(), 3);
    values.col(1) = 1e3 + (1e2 * values.col(1) + 60 * values.col(0)).array();
    values.col(2) *= 1e-6;
    for (Index k = 0; k < trials.count(); ++k)  // so that conditions differ in their means
      values(k, 0) += 2 * static_cast<double>(trials.condition[static_cast<std::size_t>(k)]);
    for (Index j = 0; j < 3; ++j)
      regressors.push_back({fmt::format("r{}", j), of_events(trials, values.col(j))});
  }
};

/// [indicators or one constant | regressors centred and divided], long double throughout.
Wide design(const Case& work, bool within) {
  const auto n = work.trials.condition.size();
  const std::size_t groups = within ? 3 : 1;
  Wide x(n, std::vector<long double>(groups + 3, 0));
  for (std::size_t i = 0; i < n; ++i) x[i][within ? work.trials.condition[i] : 0] = 1;
  for (std::size_t j = 0; j < 3; ++j) {
    long double squares = 0;
    for (std::size_t i = 0; i < n; ++i) {
      long double sum = 0, count = 0;
      for (std::size_t k = 0; k < n; ++k)
        if (!within || work.trials.condition[k] == work.trials.condition[i]) {
          sum += work.values(static_cast<Index>(k), static_cast<Index>(j));
          count += 1;
        }
      x[i][groups + j] = work.values(static_cast<Index>(i), static_cast<Index>(j)) - sum / count;
      squares += x[i][groups + j] * x[i][groups + j];
    }
    const long double sd = std::sqrt(squares / static_cast<long double>(n - groups));
    for (std::size_t i = 0; i < n; ++i) x[i][groups + j] /= sd;
  }
  return x;
}

void compare(const Case& work, bool within, double tolerance) {
  const RegressionResult found = regress(work.trials, work.regressors, {{}, within}, 0);
  const Wide x = design(work, within);
  const Index channels = work.trials.data_V.rows();
  const std::size_t groups = within ? 3 : 1;
  ASSERT_EQ(found.beta_V.size(), 3u);
  for (Index t = 0; t < work.trials.times_s.size(); ++t)
    for (Index c = 0; c < channels; ++c) {
      std::vector<long double> y;
      for (Index k = 0; k < work.trials.count(); ++k) {
        long double mean = 0;
        for (Index m = 0; m < channels; ++m) mean += work.trials.trial(k)(m, t);
        y.push_back(work.trials.trial(k)(c, t) - mean / channels);
      }
      const reference::Fit fit = reference::least_squares(x, y);
      for (std::size_t j = 0; j < 3; ++j) {
        const auto se = static_cast<double>(fit.standard_errors[groups + j]);
        EXPECT_NEAR(found.standard_error_V[j](c, t) / se, 1, tolerance);
        EXPECT_NEAR(
            (found.beta_V[j](c, t) - static_cast<double>(fit.coefficients[groups + j])) / se, 0,
            tolerance);
      }
    }
}

TEST(SignalRegression, EqualsNormalEquationsInExtendedPrecision) {
  compare(Case(), true, 1e-10);
  compare(Case(), false, 1e-10);
}

// A lead 10 mV off among signals of 10 uV: double keeps 1e-16 * 10 mV / 10 uV = 1e-13 of a sample,
// whereas sums of squares would keep 1e-10 and lose it in the difference.
TEST(SignalRegression, AnOffsetAThousandTimesTheSignalCostsNothing) {
  compare(Case(1e-2), true, 1e-11);
}

TEST(SignalRegression, EffectiveTrialsAndInflationComeFromTheInverse) {
  for (const bool within : {true, false}) {
    const Case work;
    const RegressionResult found = regress(work.trials, work.regressors, {{}, within}, 0);
    const Wide x = design(work, within);
    const std::size_t columns = within ? 6 : 4;
    Wide gram(columns, std::vector<long double>(columns, 0));
    for (const auto& row : x)
      for (std::size_t j = 0; j < columns; ++j)
        for (std::size_t k = 0; k < columns; ++k) gram[j][k] += row[j] * row[k];
    const Wide solved = reference::inverse(gram);
    for (Index j = 0; j < 3; ++j) {
      const auto at = columns - 3 + static_cast<std::size_t>(j);
      EXPECT_NEAR(found.effective_trials[j] * static_cast<double>(solved[at][at]), 1, 1e-12);
      // Variance inflation as it is defined: the regressor regressed on all other columns.
      Wide others = x;
      std::vector<long double> y;
      long double squares = 0, left = 0;
      for (auto& row : others) {
        y.push_back(row[at]);
        squares += row[at] * row[at];
        row.erase(row.begin() + static_cast<std::ptrdiff_t>(at));
      }
      const reference::Fit fit = reference::least_squares(others, y);
      for (std::size_t i = 0; i < y.size(); ++i) {
        long double residual = y[i];
        for (std::size_t k = 0; k + 1 < columns; ++k)
          residual -= others[i][k] * fit.coefficients[k];
        left += residual * residual;
      }
      EXPECT_NEAR(found.inflation[j] * static_cast<double>(left / squares), 1, 1e-12);
      EXPECT_GE(found.inflation[j], 1 - 1e-12);
    }
  }
}

}  // namespace
}  // namespace headwater
