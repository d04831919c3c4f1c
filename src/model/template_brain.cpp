// SPDX-License-Identifier: GPL-3.0-or-later
// R(u) = sum_lm c[l,m] N[l,m] (-1)^m P[l,m](cos theta) cos(m phi); theta from +z, phi = atan2(x, y)
// from +y towards +x. P carries the Condon-Shortley phase in the textbook definition, which (-1)^m
// removes; the recurrences below build (-1)^m P directly, without the phase:
//   Q[m,m] = (2m-1)!! sin^m,  Q[m+1,m] = (2m+1) cos Q[m,m],
//   Q[l,m] = ((2l-1) cos Q[l-1,m] - (l+m-1) Q[l-2,m]) / (l-m).
// N[l,m] = sqrt((2l+1)/(4 pi) (l-m)!/(l+m)!), times sqrt(2) for m > 0.
#include <headwater/base/embedded_file.hpp>
#include <headwater/base/table.hpp>
#include <headwater/base/units.hpp>
#include <headwater/model/head.hpp>
#include <headwater/model/template_brain.hpp>

#include <algorithm>
#include <array>
#include <cmath>

namespace headwater {
namespace {

constexpr int kDegree = 6;
using Triangle = std::array<std::array<double, kDegree + 1>, kDegree + 1>;

/// c[l][m] N[l][m], m (the table is in mm).
Triangle read_coefficients() {
  const Table table = parse_table(embedded_file("hull.tsv"), "templates/hull.tsv");
  const auto degree = table.column("l"), order = table.column("m"), value = table.column("c_mm");
  Triangle result{};
  for (std::size_t row = 0; row < table.rows.size(); ++row) {
    const auto l = static_cast<int>(table.number(row, degree));
    const auto m = static_cast<int>(table.number(row, order));
    double factorials = 1;  // (l-m)! / (l+m)!
    for (int k = l - m + 1; k <= l + m; ++k) factorials /= k;
    const double norm = std::sqrt((2 * l + 1) / (4 * kPi) * factorials * (m > 0 ? 2 : 1));
    result.at(l).at(m) = table.number(row, value) * kMillimetre * norm;
  }
  return result;
}

/// Depth (m) of a groove of the given depth and width at a distance from its floor line.
double groove(double distance, double depth, double width) {
  return depth * std::exp(-0.5 * (distance / width) * (distance / width));
}

double distance_to_segment(const Eigen::Vector3d& p, const Eigen::Vector3d& a,
                           const Eigen::Vector3d& b) {
  const Eigen::Vector3d along = b - a;
  const double t = std::clamp((p - a).dot(along) / along.squaredNorm(), 0.0, 1.0);
  return (p - a - t * along).norm();
}

}  // namespace

double hull_radius(const Eigen::Vector3d& direction) {
  static const Triangle coefficients = read_coefficients();
  const Eigen::Vector3d u = direction.normalized();
  const double c = u.z(), s = std::hypot(u.x(), u.y());
  const double cos_phi = s > 0 ? u.y() / s : 1, sin_phi = s > 0 ? u.x() / s : 0;
  double radius = 0, diagonal = 1;  // diagonal: Q[m,m]
  double cos_m = 1, sin_m = 0;      // cos(m phi), sin(m phi)
  for (int m = 0; m <= kDegree; ++m) {
    double before = 0, q = diagonal;
    for (int l = m; l <= kDegree; ++l) {
      radius += coefficients[l][m] * q * cos_m;
      const double next = ((2 * l + 1) * c * q - (l + m) * before) / (l + 1 - m);
      before = q;
      q = next;
    }
    diagonal *= (2 * m + 1) * s;
    const double turned = cos_m * cos_phi - sin_m * sin_phi;
    sin_m = sin_m * cos_phi + cos_m * sin_phi;
    cos_m = turned;
  }
  return radius;
}

double drawn_brain_radius(const Eigen::Vector3d& direction) {
  const double radius = hull_radius(direction);
  const Eigen::Vector3d mni_mm = (radius * direction.normalized() + kHeadCentreMni) / kMillimetre;
  // The longitudinal groove fades out from z = -5 to z = -35 mm.
  const double fade = std::clamp((mni_mm.z() + 35) / 30, 0.0, 1.0);
  const double longitudinal = fade * groove(mni_mm.x(), 8, 5.1);
  static const std::array<Eigen::Vector3d, 4> lateral_line{
      {{53, 35, -21}, {66, 11, -5}, {71, -15, 4}, {68, -39, 20}}};
  const Eigen::Vector3d right(std::abs(mni_mm.x()), mni_mm.y(), mni_mm.z());
  double distance = 1e9;
  for (std::size_t k = 0; k + 1 < lateral_line.size(); ++k)
    distance = std::min(distance, distance_to_segment(right, lateral_line[k], lateral_line[k + 1]));
  return radius - (longitudinal + groove(distance, 6, 5)) * kMillimetre;
}

}  // namespace headwater
