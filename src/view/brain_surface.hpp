// SPDX-License-Identifier: GPL-3.0-or-later
// The template brain's surface as triangles, and the rule by which a source map is painted on it.
//
// Painting rule. From each vertex a line runs inwards, towards the head centre, to a depth of 25
// mm. At every step along it the map is the Gaussian mean of the source points about that place
// (standard deviation 3/4 of the lattice spacing, cut off at 5/2 of it); the vertex shows the
// largest of these means. So the colours of the bar keep their meaning, a generator in the depth of
// the lateral fissure (about 20 mm below the hull) is seen, and whatever lies deeper than 25 mm is
// not painted at all: source points deeper than that are left out of the means from the start, so a
// deep maximum can never look superficial. Where no point is near, the colour is that of zero.
#pragma once
#include <Eigen/Core>

namespace headwater {

/// Depth (mm) to which the surface shows what lies below it.
inline constexpr double kShownDepth_mm = 25;

struct SurfaceMesh {
  Eigen::Matrix3Xd vertices_mm;  ///< MNI
  Eigen::Matrix3Xd normals;      ///< outward, unit length
  Eigen::Matrix3Xi triangles;    ///< vertex numbers, anticlockwise seen from outside
};

/// The drawn brain on an icosahedron whose edges are halved `halvings` times (10 * 4^k + 2
/// vertices, exactly mirror-symmetric in x).
SurfaceMesh drawn_brain(int halvings);

/// The value shown at each vertex. points_mm 3 by #points (MNI), values #points, non-negative.
Eigen::VectorXd painted_values(const SurfaceMesh& surface, const Eigen::Matrix3Xd& points_mm,
                               const Eigen::VectorXd& values, double spacing_mm);

/// How far a point lies below the brain's hull on the line to the head centre (mm; negative:
/// outside).
double depth_below_hull_mm(const Eigen::Vector3d& mni_mm);

/// How far a point lies below the hull when looked at along `towards_viewer` (mm; unit length):
/// the way to the hull in that direction, 0 for a point outside.
double depth_seen_mm(const Eigen::Vector3d& mni_mm, const Eigen::Vector3d& towards_viewer);

}  // namespace headwater
