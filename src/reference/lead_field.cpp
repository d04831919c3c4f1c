// SPDX-License-Identifier: GPL-3.0-or-later
#include "reference/lead_field.hpp"

#include <headwater/base/units.hpp>
#include <headwater/model/sphere_series.hpp>

#include <cmath>

namespace headwater::reference {
namespace {

/// Terms after which b^(n-1) (2n+1) stays below 1e-11 of its largest value.
Eigen::Index terms_needed(double b) {
  Eigen::Index n = 1;
  double term = 3, largest = 3;
  while (term > 1e-11 * largest) {
    ++n;
    const double degree = static_cast<double>(n);
    term = (2 * degree + 1) * std::pow(b, degree - 1);
    largest = std::max(largest, term);
  }
  return n;
}

}  // namespace

Eigen::MatrixXd compute_gain(const HeadModel& head, const Eigen::Matrix3Xd& electrodes,
                             const Eigen::Matrix3Xd& points_m) {
  const auto outer = head.radii_m.size() - 1;
  const double radius = head.radii_m[outer];
  const double scale = 1 / (4 * kPi * head.conductivity_S_per_m[outer] * radius * radius);
  const double largest_b = points_m.cols() > 0 ? points_m.colwise().norm().maxCoeff() / radius : 0;
  const Eigen::VectorXd f = shell_factors(head, terms_needed(largest_b));
  Eigen::MatrixXd gain(electrodes.cols(), 3 * points_m.cols());
  for (Eigen::Index p = 0; p < points_m.cols(); ++p) {
    const double r0 = points_m.col(p).norm(), b = r0 / radius;
    const Eigen::Vector3d u =
        r0 > 0 ? Eigen::Vector3d(points_m.col(p) / r0) : Eigen::Vector3d::UnitZ();
    const Eigen::Index terms = terms_needed(b);
    for (Eigen::Index m = 0; m < electrodes.cols(); ++m) {
      const Eigen::Vector3d e = electrodes.col(m).normalized();
      const double x = u.dot(e);
      double p_before = 1, p_now = x, d_before = 0, d_now = 1, power = 1, a = 0, t = 0;
      for (Eigen::Index i = 0; i < terms; ++i) {
        const double n = static_cast<double>(i + 1);
        a += (2 * n + 1) * power * f[i] * p_now;
        t += (2 * n + 1) / n * power * f[i] * d_now;
        const double p_next = ((2 * n + 1) * x * p_now - n * p_before) / (n + 1);
        const double d_next = d_before + (2 * n + 1) * p_now;
        p_before = p_now;
        p_now = p_next;
        d_before = d_now;
        d_now = d_next;
        power *= b;
      }
      gain.block<1, 3>(m, 3 * p) = scale * ((a - x * t) * u + t * e).transpose();
    }
  }
  return gain;
}

}  // namespace headwater::reference
