// SPDX-License-Identifier: GPL-3.0-or-later
// Lays the sphere flat.
#pragma once
#include <Eigen/Core>

namespace headwater {

/// Azimuthal equidistant map of the head from above: angle from the vertex (+z) in radians as the
/// distance from the origin, nose (+y) up, right (+x) to the right. Head-frame direction of length
/// > 0.
Eigen::Vector2d flat_position(const Eigen::Vector3d& direction);
/// Unit vector at a place of the flat map.
Eigen::Vector3d unflattened(const Eigen::Vector2d& position);

}  // namespace headwater
