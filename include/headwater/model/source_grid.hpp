// SPDX-License-Identifier: GPL-3.0-or-later
// Where sources may lie: a cubic lattice through x = 0 in MNI space, mirrored exactly, kept where
// the template anatomy has cortex; or the user's own points.
//
// With d = R(u) - r the depth below the hull (mm MNI), a lattice point is kept when d > 1, z > -48,
// it lies above the tentorium (y > -25, or z > -27.3 - 0.814|x| - 1.011 y + 5.33 (x/30)^2 - 30.7
// (y/60)^2), and any of
//   convexity               d <= 18
//   medial wall             |x| <= 12, outside the white-matter core: ((|x|-21)/25)^2 +
//   ((y+15)/68)^2 +
//                           ((z+22)/77)^2 < 1 or (x/23)^2 + ((y+36)/10)^2 + ((z+19)/27)^2 < 1
//   insula and opercula     d <= 34, |x| >= 30, -42 < y < 28, -20 < z < 24
//   medial temporal strip   12 <= |x| <= 36, -85 < y < 0, -34 < z < -6
// Source: measured on MNI-space volumes, see templates/README.md. Point counts: 10 mm 1102, 8 mm
// 2126, 7 mm 3170, 6 mm 5066, 5 mm 8673.
#pragma once
#include <headwater/base/labels.hpp>
#include <headwater/base/volume.hpp>

#include <Eigen/Core>

#include <vector>

namespace headwater {

struct SourceGrid {
  Labels names;              ///< of the user's points; empty for a lattice
  Eigen::Matrix3Xd mni_m;    ///< 3 by N
  Eigen::Matrix3Xd head_m;   ///< 3 by N, after mni_to_head (or as given in the head frame)
  double spacing_m = 0;      ///< of the lattice; of the user's points the median nearest (MNI)
  Eigen::Matrix3Xi lattice;  ///< 3 by N, mni = spacing * lattice; empty for the user's points
  /// Point that is this one's image in x; itself on the midline, -1 where the user's points have
  /// none within 1 mm. An involution.
  std::vector<Eigen::Index> mirror;
  Eigen::VectorXd depth_m;  ///< below the hull, along the ray from the head's centre

  Eigen::Index size() const { return mni_m.cols(); }
  bool is_lattice() const { return lattice.cols() > 0; }
};

/// spacing 4 to 12 mm (ExperimentError otherwise), points ordered by z, then y, then x.
SourceGrid lattice_grid(double spacing_m, double scalp_radius_m);

enum class PointSpace { mni, head };

/// The user's points. In the head frame they are used as they are, and their MNI coordinates come
/// from the inverse mapping. Throws InputError: repeated points, non-finite coordinates.
SourceGrid point_grid(const Labels& names, const Eigen::Matrix3Xd& points_m, PointSpace space,
                      double scalp_radius_m);

/// Neighbours of each lattice point among its 26 (faces, edges, corners), sorted. For the user's
/// points: those within 1.8 times the median nearest distance (a lattice's corner is at 1.73).
std::vector<std::vector<Eigen::Index>> grid_neighbours(const SourceGrid& grid);

/// The lattice as an empty volume (values zero, one column), and the voxel of each point. Throws
/// std::logic_error for the user's points.
Volume lattice_volume(const SourceGrid& grid);
std::vector<Eigen::Index> lattice_voxels(const SourceGrid& grid);

}  // namespace headwater
