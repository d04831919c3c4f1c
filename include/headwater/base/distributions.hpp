// SPDX-License-Identifier: GPL-3.0-or-later
// Special functions and quantiles of distributions (Boost.Math), to a few units of the last place.
// Arguments outside the stated range: std::domain_error.
#pragma once

namespace headwater {

/// Derivative of the logarithm of the gamma function, x > 0.
double digamma(double x);

/// The value that a standard normal variable stays below with probability p, 0 < p < 1.
double normal_quantile(double p);

/// The same of a chi-squared variable of `degrees` > 0, 0 < p < 1; degrees need not be whole.
double chi_squared_quantile(double p, double degrees);

}  // namespace headwater
