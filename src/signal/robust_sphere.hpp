// SPDX-License-Identifier: GPL-3.0-or-later
// Sphere through the electrodes that a few misplaced ones do not pull.
#pragma once
#include <headwater/base/sphere_fit.hpp>

#include <string>
#include <vector>

namespace headwater {

struct RobustSphere {
  SphereFit fit;             ///< residual: of every point; rms: of those that entered
  std::vector<bool> inside;  ///< entered the fit
};

/// points in m. Least squares over the points within the larger of 5 robust spreads (1.4826 times
/// the median of |residual|) and 15 mm. Throws InputError as fit_sphere.
RobustSphere fit_robust_sphere(const Eigen::Matrix3Xd& points);

/// The same, its errors with the source named.
RobustSphere fit_head(const Eigen::Matrix3Xd& points, const std::string& source);

/// 60 to 140 mm: from infants to anything that could be a head.
bool is_head_radius(double radius_m);

}  // namespace headwater
