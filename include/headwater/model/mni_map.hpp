// SPDX-License-Identifier: GPL-3.0-or-later
// From MNI space to the spherical model and back: a radial homothety about the head centre C. A
// point at distance r from C in direction u goes to r / R(u) * 0.83 * scalp radius in the same
// direction, R(u) the hull radius. Invertible, exact in left-right symmetry; the hull itself lands
// at 0.83 of the scalp radius. Mean displacement on the template's own scale 5.7 mm; basal points
// move most (up to 37 mm). A published relative: Spinelli et al. 2000 Brain Topography 13:115.
#pragma once
#include <Eigen/Core>

namespace headwater {

/// Share of the scalp radius at which the hull lies: measured hull over scalp 0.832 (SD 0.018).
inline constexpr double kHullToScalp = 0.83;

/// MNI (m) -> head frame (m).
Eigen::Vector3d mni_to_head(const Eigen::Vector3d& mni_m, double scalp_radius_m);

/// Head frame (m) -> MNI (m). Inverse of mni_to_head to rounding.
Eigen::Vector3d head_to_mni(const Eigen::Vector3d& head_m, double scalp_radius_m);

/// Depth (m) of an MNI point below the hull along the ray from the head centre; negative outside.
double depth_below_hull(const Eigen::Vector3d& mni_m);

}  // namespace headwater
