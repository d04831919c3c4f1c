// SPDX-License-Identifier: GPL-3.0-or-later
// Points go to CGAL in the order of their coordinates and triangles come out sorted: where four
// points of a sphere lie on one circle, the diagonal that is chosen does not depend on the points'
// order.
#include <headwater/base/convex_hull.hpp>
#include <headwater/base/error.hpp>

#include <CGAL/Exact_predicates_inexact_constructions_kernel.h>
#include <CGAL/Surface_mesh.h>
#include <CGAL/convex_hull_3.h>
#include <fmt/core.h>

#include <algorithm>
#include <array>
#include <map>
#include <set>

namespace headwater {
namespace {

using Kernel = CGAL::Exact_predicates_inexact_constructions_kernel;
using Mesh = CGAL::Surface_mesh<Kernel::Point_3>;
using Coordinates = std::array<double, 3>;

/// Index of each distinct point (the first of equal ones), in the order of coordinates.
std::map<Coordinates, int> sorted_points(const Eigen::Ref<const Eigen::Matrix3Xd>& points) {
  std::map<Coordinates, int> result;
  for (Eigen::Index i = 0; i < points.cols(); ++i)
    result.emplace(Coordinates{points(0, i), points(1, i), points(2, i)}, static_cast<int>(i));
  return result;
}

bool in_one_plane(const std::vector<Kernel::Point_3>& points) {
  const auto& a = points[0];
  const auto b = std::find_if(points.begin(), points.end(), [&](const auto& p) { return p != a; });
  if (b == points.end()) return true;
  const auto c = std::find_if(points.begin(), points.end(),
                              [&](const auto& p) { return !CGAL::collinear(a, *b, p); });
  if (c == points.end()) return true;
  return std::all_of(points.begin(), points.end(),
                     [&](const auto& p) { return CGAL::coplanar(a, *b, *c, p); });
}

}  // namespace

Eigen::Matrix3Xi convex_hull_triangles(const Eigen::Ref<const Eigen::Matrix3Xd>& points) {
  if (points.cols() < 4)
    throw InputError(fmt::format("convex hull: {} points, at least 4 expected.", points.cols()));
  if (!points.allFinite()) throw InputError("convex hull: a coordinate is not a finite number.");
  const auto index = sorted_points(points);
  std::vector<Kernel::Point_3> sorted;
  for (const auto& [at, i] : index) sorted.emplace_back(at[0], at[1], at[2]);
  if (in_one_plane(sorted))
    throw InputError(
        "convex hull: all points lie in one plane; positions around the head are expected.");

  Mesh mesh;
  CGAL::convex_hull_3(sorted.begin(), sorted.end(), mesh);
  std::vector<std::array<int, 3>> triangles;
  for (const auto face : mesh.faces()) {
    std::array<int, 3> triangle{};
    int corner = 0;
    for (const auto vertex : mesh.vertices_around_face(mesh.halfedge(face))) {
      const auto& p = mesh.point(vertex);
      triangle.at(corner++) = index.at({p.x(), p.y(), p.z()});
    }
    std::rotate(triangle.begin(), std::min_element(triangle.begin(), triangle.end()),
                triangle.end());
    triangles.push_back(triangle);
  }
  std::sort(triangles.begin(), triangles.end());
  Eigen::Matrix3Xi result(3, static_cast<Eigen::Index>(triangles.size()));
  for (std::size_t t = 0; t < triangles.size(); ++t)
    result.col(static_cast<Eigen::Index>(t)) =
        Eigen::Map<const Eigen::Vector3i>(triangles[t].data());
  return result;
}

std::vector<std::vector<Eigen::Index>> triangle_neighbours(
    const Eigen::Matrix3Xi& triangles, const Eigen::Ref<const Eigen::Matrix3Xd>& points,
    double longest_edge) {
  std::vector<std::set<Eigen::Index>> sets(static_cast<std::size_t>(points.cols()));
  for (Eigen::Index t = 0; t < triangles.cols(); ++t)
    for (int corner = 0; corner < 3; ++corner) {
      const Eigen::Index a = triangles(corner, t), b = triangles((corner + 1) % 3, t);
      if ((points.col(a) - points.col(b)).norm() > longest_edge) continue;
      sets.at(static_cast<std::size_t>(a)).insert(b);
      sets.at(static_cast<std::size_t>(b)).insert(a);
    }
  std::vector<std::vector<Eigen::Index>> result;
  for (const auto& set : sets) result.emplace_back(set.begin(), set.end());
  return result;
}

}  // namespace headwater
