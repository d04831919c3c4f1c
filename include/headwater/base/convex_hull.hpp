// SPDX-License-Identifier: GPL-3.0-or-later
// Triangulations of points on a sphere (CGAL): the convex hull of points on a sphere is their
// Delaunay triangulation on it.
#pragma once
#include <Eigen/Core>

#include <utility>
#include <vector>

namespace headwater {

/// Triangles (3 by #triangles point indices, counter-clockwise seen from outside) of the convex
/// hull of 3 by #points. Throws InputError with fewer than 4 points or points in one plane. Points
/// inside the hull belong to no triangle.
Eigen::Matrix3Xi convex_hull_triangles(const Eigen::Ref<const Eigen::Matrix3Xd>& points);

/// Sorted neighbours of each point over triangle edges no longer than `longest_edge` (same unit).
std::vector<std::vector<Eigen::Index>> triangle_neighbours(
    const Eigen::Matrix3Xi& triangles, const Eigen::Ref<const Eigen::Matrix3Xd>& points,
    double longest_edge);

}  // namespace headwater
