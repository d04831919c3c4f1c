// SPDX-License-Identifier: GPL-3.0-or-later
// Plain twin of regress(), for tests: one channel and sample after the other, normal equations in
// extended precision.
#pragma once
#include <vector>

namespace headwater::reference {

struct Fit {
  std::vector<long double> coefficients;     ///< of each column
  std::vector<long double> standard_errors;  ///< of each column
};

/// Least squares of y on the columns of x (n by p).
Fit least_squares(const std::vector<std::vector<long double>>& x,
                  const std::vector<long double>& y);

/// Inverse of a symmetric positive definite matrix by Gauss-Jordan elimination with pivots.
std::vector<std::vector<long double>> inverse(std::vector<std::vector<long double>> matrix);

}  // namespace headwater::reference
