// SPDX-License-Identifier: GPL-3.0-or-later
#include "regression.hpp"

#include <cmath>
#include <utility>

namespace headwater::reference {

std::vector<std::vector<long double>> inverse(std::vector<std::vector<long double>> matrix) {
  const std::size_t p = matrix.size();
  for (std::size_t i = 0; i < p; ++i) {
    matrix[i].resize(2 * p, 0);
    matrix[i][p + i] = 1;
  }
  for (std::size_t k = 0; k < p; ++k) {
    std::size_t best = k;
    for (std::size_t i = k; i < p; ++i)
      if (std::abs(matrix[i][k]) > std::abs(matrix[best][k])) best = i;
    std::swap(matrix[k], matrix[best]);
    const long double pivot = matrix[k][k];
    for (long double& entry : matrix[k]) entry /= pivot;
    for (std::size_t i = 0; i < p; ++i) {
      if (i == k) continue;
      const long double factor = matrix[i][k];
      for (std::size_t j = 0; j < 2 * p; ++j) matrix[i][j] -= factor * matrix[k][j];
    }
  }
  for (auto& row : matrix) row.erase(row.begin(), row.begin() + static_cast<std::ptrdiff_t>(p));
  return matrix;
}

Fit least_squares(const std::vector<std::vector<long double>>& x,
                  const std::vector<long double>& y) {
  const std::size_t n = x.size(), p = x.front().size();
  std::vector<std::vector<long double>> gram(p, std::vector<long double>(p, 0));
  std::vector<long double> right(p, 0);
  for (std::size_t i = 0; i < n; ++i)
    for (std::size_t j = 0; j < p; ++j) {
      right[j] += x[i][j] * y[i];
      for (std::size_t k = 0; k < p; ++k) gram[j][k] += x[i][j] * x[i][k];
    }
  const auto solved = inverse(gram);
  Fit fit{std::vector<long double>(p, 0), std::vector<long double>(p, 0)};
  for (std::size_t j = 0; j < p; ++j)
    for (std::size_t k = 0; k < p; ++k) fit.coefficients[j] += solved[j][k] * right[k];
  long double squares = 0;
  for (std::size_t i = 0; i < n; ++i) {
    long double residual = y[i];
    for (std::size_t j = 0; j < p; ++j) residual -= x[i][j] * fit.coefficients[j];
    squares += residual * residual;
  }
  for (std::size_t j = 0; j < p; ++j)
    fit.standard_errors[j] = std::sqrt(squares / static_cast<long double>(n - p) * solved[j][j]);
  return fit;
}

}  // namespace headwater::reference
