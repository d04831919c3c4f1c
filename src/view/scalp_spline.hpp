// SPDX-License-Identifier: GPL-3.0-or-later
// Interpolates the potential between electrodes on the sphere, and lays the sphere flat.
//
// Spherical spline (Perrin et al. 1989, Electroenceph Clin Neurophysiol 72:184, with the
// corrigendum 76:565): V(u) = c_0 + sum_i c_i g(u . e_i), sum_i c_i = 0,
//   g(x) = 1/(4 pi) sum_{n>=1} (2n+1) / (n (n+1))^4 P_n(x),
// through the measured values exactly. Of all surfaces through them it bends least.
#pragma once
#include <Eigen/Core>

namespace headwater {

class ScalpSpline {
 public:
  /// directions 3 by #channels (any length > 0, no two alike), values #channels.
  ScalpSpline(const Eigen::Matrix3Xd& directions, const Eigen::VectorXd& values);
  double operator()(const Eigen::Vector3d& direction) const;

 private:
  Eigen::Matrix3Xd electrodes_;  // unit vectors
  Eigen::VectorXd weights_;      // c_i, then c_0
};

/// Azimuthal equidistant map of the head from above: angle from the vertex (+z) in radians as the
/// distance from the origin, nose (+y) up, right (+x) to the right. Head-frame direction of length
/// > 0.
Eigen::Vector2d flat_position(const Eigen::Vector3d& direction);
/// Unit vector at a place of the flat map.
Eigen::Vector3d unflattened(const Eigen::Vector2d& position);

}  // namespace headwater
