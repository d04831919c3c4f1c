// SPDX-License-Identifier: GPL-3.0-or-later
// Second route to the shell factors: for each degree n, the boundary conditions of K shells written
// out as one system of linear equations, without the recurrence of model/sphere_series. In shell k,
// between its radii a and c, the potential of degree n is p (r/c)^n + q (a/r)^(n+1), powers that
// stay within 0 and 1; in the innermost shell q belongs to the dipole and a stands for c.
#pragma once
#include <headwater/model/head.hpp>

#include <Eigen/LU>

#include <cmath>

namespace headwater {

/// f_n: surface potential over that of the formula with f_n = 1, which is sigma_1-free:
/// (2n+1)/n / sigma_K for a dipole term r^-(n+1) / sigma_1 on the unit sphere.
inline double shell_factor_from_boundaries(const HeadModel& head, int n) {
  using Matrix = Eigen::Matrix<long double, Eigen::Dynamic, Eigen::Dynamic>;
  const auto shells = head.radii_m.size();
  const auto outer = head.radii_m[shells - 1];
  const auto radius = [&](Eigen::Index k) -> long double { return head.radii_m[k] / outer; };
  const auto sigma = [&](Eigen::Index k) -> long double { return head.conductivity_S_per_m[k]; };
  const auto power = [](long double base, int exponent) { return std::pow(base, exponent); };
  // Unknowns: p_0, then (p_k, q_k). Equations: potential and current at each interface, current at
  // the scalp. The dipole's q_0 is such that q_0 (c/r)^(n+1) = r^-(n+1) / sigma_1; the common
  // factor c^-(n+1), which would overflow, is taken out and put back through the logarithm.
  const Eigen::Index unknowns = 2 * shells - 1;
  Matrix system = Matrix::Zero(unknowns, unknowns), right = Matrix::Zero(unknowns, 1);
  const long double degree = n;
  for (Eigen::Index k = 0; k + 1 < shells; ++k) {
    const long double c = radius(k), fall = power(c / radius(k + 1), n);
    const Eigen::Index in = k == 0 ? 0 : 2 * k - 1, out = 2 * k + 1, potential = 2 * k,
                       current = 2 * k + 1;
    system(potential, in) = 1;
    system(current, in) = sigma(k) * degree;
    if (k == 0) {
      right(potential, 0) = -1 / sigma(0);
      right(current, 0) = degree + 1;
    } else {
      const long double q = power(radius(k - 1) / c, n + 1);
      system(potential, in + 1) = q;
      system(current, in + 1) = -sigma(k) * (degree + 1) * q;
    }
    system(potential, out) = -fall;
    system(potential, out + 1) = -1;
    system(current, out) = -sigma(k + 1) * degree * fall;
    system(current, out + 1) = sigma(k + 1) * (degree + 1);
  }
  const long double last = shells > 1 ? power(radius(shells - 2), n + 1) : 1;
  system(unknowns - 1, shells > 1 ? unknowns - 2 : 0) = degree;
  if (shells > 1)
    system(unknowns - 1, unknowns - 1) = -(degree + 1) * last;
  else
    right(unknowns - 1, 0) = (degree + 1) / sigma(0);
  const Matrix solution = system.partialPivLu().solve(right);
  long double surface = solution(shells > 1 ? unknowns - 2 : 0, 0);
  surface += shells > 1 ? solution(unknowns - 1, 0) * last : 1 / sigma(0);
  // Undo the scaling: the dipole term was 1 at the innermost radius instead of c^-(n+1).
  surface *= std::exp(-(degree + 1) * std::log(radius(0)));
  return static_cast<double>(surface * sigma(shells - 1) * degree / (2 * degree + 1));
}

}  // namespace headwater
