// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/model/head.hpp>
#include <headwater/model/mni_map.hpp>
#include <headwater/model/template_brain.hpp>

namespace headwater {

// At the centre the direction is undefined and the distance zero: the point stays.
Eigen::Vector3d mni_to_head(const Eigen::Vector3d& mni_m, double scalp_radius_m) {
  const Eigen::Vector3d from_centre = mni_m - kHeadCentreMni;
  if (from_centre.squaredNorm() == 0) return Eigen::Vector3d::Zero();
  return from_centre * (kHullToScalp * scalp_radius_m / hull_radius(from_centre));
}

Eigen::Vector3d head_to_mni(const Eigen::Vector3d& head_m, double scalp_radius_m) {
  if (head_m.squaredNorm() == 0) return kHeadCentreMni;
  return head_m * (hull_radius(head_m) / (kHullToScalp * scalp_radius_m)) + kHeadCentreMni;
}

double depth_below_hull(const Eigen::Vector3d& mni_m) {
  const Eigen::Vector3d from_centre = mni_m - kHeadCentreMni;
  if (from_centre.squaredNorm() == 0) return hull_radius(Eigen::Vector3d::UnitZ());
  return hull_radius(from_centre) - from_centre.norm();
}

}  // namespace headwater
