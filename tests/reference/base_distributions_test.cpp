// SPDX-License-Identifier: GPL-3.0-or-later
// Special functions against closed forms and printed tables.
#include <headwater/base/distributions.hpp>

#include <gtest/gtest.h>

#include <cmath>
#include <limits>
#include <stdexcept>

namespace headwater {
namespace {

constexpr double kEulerGamma = 0.57721566490153286061;

// Abramowitz & Stegun 1964, 6.3.2, 6.3.3 and 6.3.5: psi(1) = -gamma, psi(1/2) = -gamma - 2 ln 2,
// psi(x+1) = psi(x) + 1/x.
TEST(BaseDistributions, DigammaOfClosedFormsAndRecurrence) {
  EXPECT_NEAR(digamma(1), -kEulerGamma, 1e-15);
  EXPECT_NEAR(digamma(0.5), -kEulerGamma - 2 * std::log(2.0), 1e-15);
  for (const double x : {1e-3, 0.3, 2.7, 14.5, 900.0})
    EXPECT_NEAR(digamma(x + 1), digamma(x) + 1 / x, 1e-14 * (1 / x + std::abs(digamma(x)))) << x;
}

// The distribution function is known to the standard library: 1/2 erfc(-z / sqrt 2). The quantile's
// error is that of p divided by the density, at least 1e-4 here.
TEST(BaseDistributions, NormalQuantileInvertsTheErrorFunction) {
  for (const double p : {1e-4, 0.025, 0.2, 0.5, 0.9, 0.975, 0.9999})
    EXPECT_NEAR(0.5 * std::erfc(-normal_quantile(p) / std::sqrt(2.0)), p, 1e-15) << p;
  // Abramowitz & Stegun 1964, table 26.5, Q(x) = 0.025 (digits as printed).
  EXPECT_NEAR(normal_quantile(0.975), 1.95996, 5e-6);
}

TEST(BaseDistributions, ChiSquaredQuantileOfClosedFormsAndTables) {
  for (const double p : {0.025, 0.5, 0.975}) {
    // Two degrees: exponential of mean 2. One: square of a normal variable.
    EXPECT_NEAR(chi_squared_quantile(p, 2), -2 * std::log1p(-p), 1e-14);
    EXPECT_NEAR(chi_squared_quantile(p, 1), std::pow(normal_quantile(0.5 + p / 2), 2), 1e-14);
  }
  // Abramowitz & Stegun 1964, table 26.8: upper 2.5 % and 97.5 % points of 10 degrees.
  EXPECT_NEAR(chi_squared_quantile(0.975, 10), 20.4831, 5e-4);
  EXPECT_NEAR(chi_squared_quantile(0.025, 10), 3.24697, 5e-5);
}

TEST(BaseDistributions, RefusesArgumentsOutsideTheRange) {
  const double nan = std::numeric_limits<double>::quiet_NaN();
  for (const double x : {0.0, -1.0, nan}) {
    EXPECT_THROW(digamma(x), std::domain_error);
    EXPECT_THROW(normal_quantile(x), std::domain_error);
    EXPECT_THROW(chi_squared_quantile(x, 3), std::domain_error);
    EXPECT_THROW(chi_squared_quantile(0.5, x), std::domain_error);
  }
  EXPECT_THROW(normal_quantile(1), std::domain_error);
}

}  // namespace
}  // namespace headwater
