// SPDX-License-Identifier: GPL-3.0-or-later
#include "view/brain_surface.hpp"

#include <headwater/base/parallel.hpp>
#include <headwater/base/units.hpp>
#include <headwater/model/head.hpp>
#include <headwater/model/template_brain.hpp>

#include <Eigen/Geometry>

#include <algorithm>
#include <array>
#include <cmath>
#include <map>
#include <utility>
#include <vector>

namespace headwater {
namespace {

const Eigen::Vector3d kCentre_mm = kHeadCentreMni / kMillimetre;
constexpr double kDepthStep_mm = 2.5;

struct Sphere {
  std::vector<Eigen::Vector3d> vertices;
  std::vector<std::array<int, 3>> triangles;
};

/// Vertices (0, +-1, +-g) and their cyclic turns, g the golden ratio: symmetric in x, y and z.
Sphere icosahedron() {
  const double g = (1 + std::sqrt(5.0)) / 2;
  Sphere s;
  for (const double a : {-1.0, 1.0})
    for (const double b : {-g, g})
      for (int turn = 0; turn < 3; ++turn) {
        Eigen::Vector3d v;
        v[turn] = 0, v[(turn + 1) % 3] = a, v[(turn + 2) % 3] = b;
        s.vertices.push_back(v.normalized());
      }
  const double edge = 2.1 / std::sqrt(1 + g * g);  // the edge is 2 / |(0, 1, g)|
  const auto near = [&](int i, int j) { return (s.vertices[i] - s.vertices[j]).norm() < edge; };
  for (int i = 0; i < 12; ++i)
    for (int j = i + 1; j < 12; ++j)
      for (int k = j + 1; k < 12; ++k) {
        if (!near(i, j) || !near(j, k) || !near(i, k)) continue;
        const bool outward = s.vertices[i].cross(s.vertices[j]).dot(s.vertices[k]) > 0;
        s.triangles.push_back(outward ? std::array{i, j, k} : std::array{i, k, j});
      }
  return s;
}

Sphere halved(const Sphere& s) {
  Sphere result{s.vertices, {}};
  std::map<std::pair<int, int>, int> middles;
  const auto middle = [&](int a, int b) {
    const auto [found, fresh] =
        middles.try_emplace(std::minmax(a, b), static_cast<int>(result.vertices.size()));
    if (fresh) result.vertices.push_back((s.vertices[a] + s.vertices[b]).normalized());
    return found->second;
  };
  for (const auto& [a, b, c] : s.triangles) {
    const int ab = middle(a, b), bc = middle(b, c), ca = middle(c, a);
    for (const auto& t : {std::array{a, ab, ca}, {ab, b, bc}, {ca, bc, c}, {ab, bc, ca}})
      result.triangles.push_back(t);
  }
  return result;
}

Eigen::Vector3d drawn_point_mm(const Eigen::Vector3d& direction) {
  return kCentre_mm + drawn_brain_radius(direction) / kMillimetre * direction;
}

/// Normal of the drawn surface by central differences (1/500 rad: about 0.2 mm, well below the
/// grooves' width).
Eigen::Vector3d drawn_normal(const Eigen::Vector3d& u) {
  constexpr double step = 2e-3;
  const Eigen::Vector3d e = u.unitOrthogonal(), f = u.cross(e);
  const auto at = [&](const Eigen::Vector3d& d) { return drawn_point_mm((u + d).normalized()); };
  const Eigen::Vector3d along_e = at(step * e) - at(-step * e);
  const Eigen::Vector3d along_f = at(step * f) - at(-step * f);
  return along_e.cross(along_f).normalized();
}

/// Gaussian mean of the map about one place; 0 where no point is near.
class LocalMean {
 public:
  LocalMean(const Eigen::Matrix3Xd& points, const Eigen::VectorXd& values, double spacing)
      : points_(points), values_(values), sigma_(0.75 * spacing), reach_(2.5 * spacing) {}

  /// The points that any place on the segment can reach.
  std::vector<Eigen::Index> near_segment(const Eigen::Vector3d& from,
                                         const Eigen::Vector3d& way) const {
    std::vector<Eigen::Index> result;
    const double length2 = way.squaredNorm();
    for (Eigen::Index i = 0; i < points_.cols(); ++i) {
      const Eigen::Vector3d offset = points_.col(i) - from;
      const double t = std::clamp(offset.dot(way) / length2, 0.0, 1.0);
      if ((offset - t * way).squaredNorm() < reach_ * reach_) result.push_back(i);
    }
    return result;
  }

  double at(const Eigen::Vector3d& place, const std::vector<Eigen::Index>& candidates) const {
    double weights = 0, sum = 0;
    for (const Eigen::Index i : candidates) {
      const double distance2 = (points_.col(i) - place).squaredNorm();
      if (distance2 >= reach_ * reach_) continue;
      const double weight = std::exp(-0.5 * distance2 / (sigma_ * sigma_));
      weights += weight;
      sum += weight * values_(i);
    }
    return weights > 0 ? sum / weights : 0;
  }

 private:
  const Eigen::Matrix3Xd& points_;
  const Eigen::VectorXd& values_;
  double sigma_, reach_;
};

}  // namespace

SurfaceMesh drawn_brain(int halvings) {
  Sphere sphere = icosahedron();
  for (int k = 0; k < halvings; ++k) sphere = halved(sphere);
  SurfaceMesh mesh;
  const auto count = static_cast<Eigen::Index>(sphere.vertices.size());
  mesh.vertices_mm.resize(3, count);
  mesh.normals.resize(3, count);
  for (Eigen::Index v = 0; v < count; ++v) {
    mesh.vertices_mm.col(v) = drawn_point_mm(sphere.vertices[v]);
    mesh.normals.col(v) = drawn_normal(sphere.vertices[v]);
  }
  mesh.triangles.resize(3, static_cast<Eigen::Index>(sphere.triangles.size()));
  for (Eigen::Index t = 0; t < mesh.triangles.cols(); ++t)
    mesh.triangles.col(t) = Eigen::Map<const Eigen::Vector3i>(sphere.triangles[t].data());
  return mesh;
}

Eigen::VectorXd painted_values(const SurfaceMesh& surface, const Eigen::Matrix3Xd& points_mm,
                               const Eigen::VectorXd& values, double spacing_mm) {
  std::vector<Eigen::Index> shown;
  for (Eigen::Index i = 0; i < points_mm.cols(); ++i)
    if (depth_below_hull_mm(points_mm.col(i)) <= kShownDepth_mm) shown.push_back(i);
  const Eigen::Matrix3Xd shown_points = points_mm(Eigen::all, shown);
  const Eigen::VectorXd shown_values = values(shown);
  const LocalMean mean(shown_points, shown_values, spacing_mm);
  Eigen::VectorXd painted = Eigen::VectorXd::Zero(surface.vertices_mm.cols());
  parallel_for(static_cast<std::size_t>(painted.size()), 0, [&](std::size_t item) {
    const auto v = static_cast<Eigen::Index>(item);
    const Eigen::Vector3d vertex = surface.vertices_mm.col(v);
    const Eigen::Vector3d way = (kCentre_mm - vertex).normalized() * kShownDepth_mm;
    const auto candidates = mean.near_segment(vertex, way);
    for (int step = 0; step * kDepthStep_mm <= kShownDepth_mm; ++step)
      painted(v) = std::max(
          painted(v), mean.at(vertex + step * kDepthStep_mm / kShownDepth_mm * way, candidates));
  });
  return painted;
}

double depth_below_hull_mm(const Eigen::Vector3d& mni_mm) {
  const Eigen::Vector3d from_centre = mni_mm - kCentre_mm;
  const double distance = from_centre.norm();
  if (distance == 0) return hull_radius(Eigen::Vector3d::UnitZ()) / kMillimetre;  // any direction
  return hull_radius(from_centre) / kMillimetre - distance;
}

double depth_seen_mm(const Eigen::Vector3d& mni_mm, const Eigen::Vector3d& towards_viewer) {
  // The hull is convex but for a fraction of a millimetre: one crossing, found by halving.
  double inside = 0, outside = 300;
  if (depth_below_hull_mm(mni_mm) <= 0) return 0;
  while (outside - inside > 0.01) {
    const double middle = (inside + outside) / 2;
    (depth_below_hull_mm(mni_mm + middle * towards_viewer) > 0 ? inside : outside) = middle;
  }
  return inside;
}

}  // namespace headwater
