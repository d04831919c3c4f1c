// SPDX-License-Identifier: GPL-3.0-or-later
// Least-squares sphere: minimises sum_i (|x_i - c| - r)^2 (geometric distance) by Gauss-Newton from
// the algebraic fit (Coope 1993, J Optim Theory Appl 76:381, linear in c and r^2 - |c|^2).
#pragma once
#include <Eigen/Core>

namespace headwater {

struct SphereFit {
  Eigen::Vector3d centre = Eigen::Vector3d::Zero();
  double radius = 0;
  Eigen::VectorXd residual;  ///< |x_i - c| - r, one for each point, in the points' unit
  double rms = 0;            ///< root mean square of residual
  bool converged = false;    ///< last step below 1e-12 radius
};

/// points: 3 by #points, any unit. Throws InputError with fewer than 4 points or points in one
/// plane.
SphereFit fit_sphere(const Eigen::Ref<const Eigen::Matrix3Xd>& points);

}  // namespace headwater
