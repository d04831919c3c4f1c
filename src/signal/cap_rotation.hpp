// SPDX-License-Identifier: GPL-3.0-or-later
// The ways to turn a cap into the head frame.
#pragma once
#include <Eigen/Core>

#include <optional>
#include <string_view>
#include <vector>

namespace headwater {

/// Electrodes named further than this from where they stand are outliers.
inline constexpr double kMisplacedDeg = 25;

struct NamesRotation {
  Eigen::Matrix3d rotation;   ///< takes `directions` to `standard`; determinant = chirality
  double mean_angle_deg = 0;  ///< over all, outliers too
};

/// Unit vectors, 3 by #names. chirality +1: a rotation; -1: a rotation of the mirror image.
NamesRotation rotation_by_names(const Eigen::Matrix3Xd& directions,
                                const Eigen::Matrix3Xd& standard, int chirality);

/// Angles between columns, degrees.
Eigen::VectorXd angles_deg(const Eigen::Matrix3Xd& a, const Eigen::Matrix3Xd& b);

/// Angle of the rotation that leads from one to the other, degrees.
double angle_between_deg(const Eigen::Matrix3d& a, const Eigen::Matrix3d& b);

/// From the cap's frame; nasion relative to the sphere's centre, ears = RPA - LPA.
Eigen::Matrix3d rotation_by_landmarks(const Eigen::Vector3d& nasion, const Eigen::Vector3d& ears);

/// Three letters, one for each axis (R or L, A or P, S or I, in any order) to a matrix that takes
/// such coordinates to RAS; nothing for other text.
std::optional<Eigen::Matrix3d> stated_axes(std::string_view letters);

}  // namespace headwater
