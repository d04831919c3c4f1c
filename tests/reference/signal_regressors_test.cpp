// SPDX-License-Identifier: GPL-3.0-or-later
// The observer's formulas against Boost.Math: its Student t, and integrals over the belief.
#include <headwater/base/units.hpp>
#include <headwater/signal/regressors.hpp>

#include <boost/math/distributions/students_t.hpp>
#include <boost/math/quadrature/exp_sinh.hpp>
#include <boost/math/quadrature/sinh_sinh.hpp>
#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

const NormalBelief kBeliefs[] = {{0, 1, 1, 1}, {2, 0.5, 3, 0.2}, {-40, 12, 25, 900}};

double log_normal(double x, double mean, double variance) {
  return -0.5 * (std::log(2 * kPi * variance) + (x - mean) * (x - mean) / variance);
}

/// Logarithm of the density of (mean, variance) under a belief.
double log_belief(const NormalBelief& belief, double mean, double variance) {
  return log_normal(mean, belief.mean, variance / belief.weight) +
         belief.shape * std::log(belief.scale) - std::lgamma(belief.shape) -
         (belief.shape + 1) * std::log(variance) - belief.scale / variance;
}

/// Integral over all means and variances of exp(log density of the belief) * of(mean, variance).
/// Means are counted in standard deviations of the belief, z, so that narrow and wide variances
/// are alike to the quadrature: d mean = sqrt(variance / weight) dz.
template <typename Function>
double expectation(const NormalBelief& belief, Function&& of) {
  boost::math::quadrature::exp_sinh<double> over_variance;
  boost::math::quadrature::sinh_sinh<double> over_mean;
  return over_variance.integrate(
      [&](double variance) {
        const double sd = std::sqrt(variance / belief.weight);
        return over_mean.integrate(
            [&](double z) {
              const double mean = belief.mean + sd * z;
              const double density = std::exp(log_belief(belief, mean, variance)) * sd;
              return density > 0 ? density * of(mean, variance) : 0.0;  // 0 * infinity far out
            },
            1e-11);
      },
      1e-11);
}

TEST(SignalRegressors, BeliefIsADensity) {
  for (const NormalBelief& belief : kBeliefs)
    EXPECT_NEAR(expectation(belief, [](double, double) { return 1.0; }), 1, 1e-9);
}

TEST(SignalRegressors, PredictiveDensityIsBoostsStudentT) {
  for (const NormalBelief& belief : kBeliefs) {
    const Prediction prediction = predict(belief);
    const boost::math::students_t t(prediction.degrees);
    for (const double z : {-30.0, -1.0, 0.0, 0.3, 5.0}) {
      const double x = prediction.mean + z * prediction.scale;
      EXPECT_NEAR(std::exp(log_density(prediction, x)) * prediction.scale / pdf(t, z), 1, 1e-12);
    }
  }
}

TEST(SignalRegressors, PredictiveDensityIsTheIntegralOverTheBelief) {
  for (const NormalBelief& belief : kBeliefs) {
    const Prediction prediction = predict(belief);
    for (const double z : {0.0, 1.3, -4.0}) {
      const double x = prediction.mean + z * prediction.scale;
      const double integral = expectation(belief, [x](double mean, double variance) {
        return std::exp(log_normal(x, mean, variance));
      });
      EXPECT_NEAR(integral / std::exp(log_density(prediction, x)), 1, 1e-8) << z;
    }
  }
}

TEST(SignalRegressors, DivergenceIsTheIntegralOfTheLogRatio) {
  for (const NormalBelief& before : kBeliefs)
    for (const NormalBelief& after :
         {update(before, before.mean + 1), update(before, before.mean - 7),
          NormalBelief{before.mean + 0.3, 2 * before.weight, before.shape + 1, before.scale / 2}}) {
      const double integral = expectation(after, [&](double mean, double variance) {
        return log_belief(after, mean, variance) - log_belief(before, mean, variance);
      });
      EXPECT_NEAR(divergence(after, before), integral, 1e-8 * (1 + integral));
      EXPECT_GT(integral, 0);
    }
  EXPECT_NEAR(divergence(kBeliefs[1], kBeliefs[1]), 0, 1e-15);
}

// The posterior by Bayes' rule: prior density times likelihood over the predictive density.
TEST(SignalRegressors, UpdateIsBayesRule) {
  for (const NormalBelief& before : kBeliefs) {
    const double x = before.mean + 1.7;
    const NormalBelief after = update(before, x);
    for (const double mean : {x, before.mean - 2})
      for (const double variance : {0.3, 5.0, 80.0}) {
        const double expected = log_belief(before, mean, variance) + log_normal(x, mean, variance) -
                                log_density(predict(before), x);
        EXPECT_NEAR(log_belief(after, mean, variance), expected, 1e-11 * (1 + std::abs(expected)));
      }
  }
}

}  // namespace
}  // namespace headwater
