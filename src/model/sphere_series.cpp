// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/model/sphere_series.hpp>

#include <cmath>

namespace headwater {

Eigen::VectorXd shell_factors(const HeadModel& head, Eigen::Index terms) {
  const auto& radii = head.radii_m;
  const auto& sigma = head.conductivity_S_per_m;
  const auto outer = radii.size() - 1;
  Eigen::VectorXd factors(terms);
  for (Eigen::Index i = 0; i < terms; ++i) {
    const double n = static_cast<double>(i + 1);
    double t = (n + 1) / n, factor = sigma[outer] / sigma[0];
    for (Eigen::Index k = outer; k > 0; --k) {
      t *= std::pow(radii[k - 1] / radii[k], 2 * n + 1);
      const double s = sigma[k] / sigma[k - 1];
      const double b_ratio = (n * (1 - s) * t + n + (n + 1) * s) / (2 * n + 1);
      t = ((n + 1 + n * s) * t + (n + 1) * (1 - s)) / ((2 * n + 1) * b_ratio);
      factor /= b_ratio;
    }
    factors[i] = factor;
  }
  return factors;
}

double shell_factor_limit(const HeadModel& head) {
  const auto& sigma = head.conductivity_S_per_m;
  const auto outer = sigma.size() - 1;
  double limit = sigma[outer] / sigma[0];
  for (Eigen::Index k = 1; k <= outer; ++k) limit *= 2 / (1 + sigma[k] / sigma[k - 1]);
  return limit;
}

}  // namespace headwater
