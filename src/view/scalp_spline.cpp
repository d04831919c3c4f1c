// SPDX-License-Identifier: GPL-3.0-or-later
#include "view/scalp_spline.hpp"

#include <headwater/base/units.hpp>

#include <Eigen/LU>

#include <algorithm>
#include <cmath>

namespace headwater {
namespace {

/// The terms fall as n^-7: those beyond 40 add less than 1e-8 of g(1).
constexpr int kTerms = 40;

double spline_kernel(double x) {
  double before = 1, legendre = x, sum = 0;
  for (int n = 1; n <= kTerms; ++n) {
    const double curvature = n * (n + 1.0);
    sum += (2 * n + 1) / (curvature * curvature * curvature * curvature) * legendre;
    const double next = ((2 * n + 1) * x * legendre - n * before) / (n + 1);
    before = legendre;
    legendre = next;
  }
  return sum / (4 * kPi);
}

}  // namespace

ScalpSpline::ScalpSpline(const Eigen::Matrix3Xd& directions, const Eigen::VectorXd& values)
    : electrodes_(directions.colwise().normalized()) {
  const Eigen::Index count = electrodes_.cols();
  Eigen::MatrixXd system = Eigen::MatrixXd::Ones(count + 1, count + 1);
  system(count, count) = 0;
  for (Eigen::Index i = 0; i < count; ++i)
    for (Eigen::Index j = 0; j < count; ++j)
      system(i, j) =
          spline_kernel(std::clamp(electrodes_.col(i).dot(electrodes_.col(j)), -1.0, 1.0));
  Eigen::VectorXd right = Eigen::VectorXd::Zero(count + 1);
  right.head(count) = values;
  weights_ = system.partialPivLu().solve(right);
}

double ScalpSpline::operator()(const Eigen::Vector3d& direction) const {
  const Eigen::Vector3d u = direction.normalized();
  double value = weights_(electrodes_.cols());
  for (Eigen::Index i = 0; i < electrodes_.cols(); ++i)
    value += weights_(i) * spline_kernel(std::clamp(u.dot(electrodes_.col(i)), -1.0, 1.0));
  return value;
}

Eigen::Vector2d flat_position(const Eigen::Vector3d& direction) {
  const double across = std::hypot(direction.x(), direction.y());
  if (across == 0) return Eigen::Vector2d(0, direction.z() < 0 ? kPi : 0);  // below: any azimuth
  return direction.head<2>() * (std::atan2(across, direction.z()) / across);
}

Eigen::Vector3d unflattened(const Eigen::Vector2d& position) {
  const double angle = position.norm();
  if (angle == 0) return Eigen::Vector3d::UnitZ();
  const Eigen::Vector2d across = position * (std::sin(angle) / angle);
  return {across.x(), across.y(), std::cos(angle)};
}

}  // namespace headwater
