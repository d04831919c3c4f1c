// SPDX-License-Identifier: GPL-3.0-or-later
#include "view/flat_map.hpp"

#include <headwater/base/units.hpp>

#include <cmath>

namespace headwater {

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
