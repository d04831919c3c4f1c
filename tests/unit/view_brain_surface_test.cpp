// SPDX-License-Identifier: GPL-3.0-or-later
#include "view/brain_surface.hpp"

#include <headwater/base/units.hpp>

#include <Eigen/Geometry>
#include <gtest/gtest.h>

#include <cmath>
#include <utility>
#include <vector>

namespace headwater {
namespace {

using Eigen::Vector3d;

Vector3d vertex_of_maximum(const SurfaceMesh& mesh, const Eigen::VectorXd& painted) {
  Eigen::Index at = 0;
  painted.maxCoeff(&at);
  return mesh.vertices_mm.col(at);
}

/// A 7 mm lattice in the hull down to 60 mm, with the value given by a function of the place.
template <typename Value>
std::pair<Eigen::Matrix3Xd, Eigen::VectorXd> lattice(Value&& value) {
  std::vector<Vector3d> places;
  for (int x = -70; x <= 70; x += 7)
    for (int y = -105; y <= 77; y += 7)
      for (int z = -42; z <= 84; z += 7) {
        const double depth = depth_below_hull_mm(Vector3d(x, y, z));
        if (depth > 1 && depth < 60) places.emplace_back(x, y, z);
      }
  Eigen::Matrix3Xd points(3, static_cast<Eigen::Index>(places.size()));
  Eigen::VectorXd values(points.cols());
  for (Eigen::Index i = 0; i < points.cols(); ++i) {
    points.col(i) = places[static_cast<std::size_t>(i)];
    values(i) = value(places[static_cast<std::size_t>(i)]);
  }
  return {points, values};
}

TEST(ViewBrainSurface, IsClosedOutwardAndOfTheStatedSize) {
  const SurfaceMesh mesh = drawn_brain(3);
  EXPECT_EQ(mesh.vertices_mm.cols(), 10 * 64 + 2);
  EXPECT_EQ(mesh.triangles.cols(), 20 * 64);
  double volume = 0;  // cubic mm
  for (Eigen::Index t = 0; t < mesh.triangles.cols(); ++t) {
    const Vector3d a = mesh.vertices_mm.col(mesh.triangles(0, t)),
                   b = mesh.vertices_mm.col(mesh.triangles(1, t)),
                   c = mesh.vertices_mm.col(mesh.triangles(2, t));
    volume += a.dot(b.cross(c)) / 6;
    const Vector3d face = (b - a).cross(c - a);
    EXPECT_GT(face.dot(mesh.normals.col(mesh.triangles(0, t))), 0) << t;
  }
  // The hull's mean radius over all directions is R0 = c[0,0] / sqrt(4 pi) = 73.2 mm, and the mean
  // of R^3 is R0^3 + 3 R0 sum c^2 / (4 pi) = 1.096 R0^3 to second order (orthogonality; templates/
  // hull.tsv). Grooves and flat triangles take a few per cent off.
  const double share = volume / (4 * kPi / 3 * 73.2 * 73.2 * 73.2);
  EXPECT_LT(share, 1.1);
  EXPECT_GT(share, 1.03);
}

TEST(ViewBrainSurface, IsItsOwnMirrorImage) {
  const SurfaceMesh mesh = drawn_brain(3);
  for (Eigen::Index v = 0; v < mesh.vertices_mm.cols(); ++v) {
    const Vector3d mirrored = mesh.vertices_mm.col(v).cwiseProduct(Vector3d(-1, 1, 1));
    EXPECT_LT((mesh.vertices_mm.colwise() - mirrored).colwise().norm().minCoeff(), 1e-9);
  }
}

// A generator at the depth of the transverse temporal gyrus is seen, on its own side, above itself.
TEST(ViewBrainSurface, ShowsATemporalMaximumOnItsSide) {
  const Vector3d source(-50, -20, 8);
  const auto [points, values] =
      lattice([&](const Vector3d& p) { return std::exp(-0.5 * (p - source).squaredNorm() / 225); });
  const SurfaceMesh mesh = drawn_brain(5);
  const Eigen::VectorXd painted = painted_values(mesh, points, values, 7);
  const Vector3d seen = vertex_of_maximum(mesh, painted);
  EXPECT_LT(seen.x(), 0);
  // The line inwards from the brightest vertex passes the source within a lattice step.
  const Vector3d inwards = (Vector3d(0, -15.4, -2.8) - seen).normalized();
  EXPECT_LT((source - seen).cross(inwards).norm(), 7);
  // Smoothed by an SD of 5.25 mm, a Gaussian of SD 15 mm keeps (15^2 / (15^2 + 5.25^2))^1.5 = 0.84
  // of its maximum; the cut at 25 mm and the lattice move that by a few hundredths.
  EXPECT_NEAR(painted.maxCoeff(), 0.84, 0.06);
}

TEST(ViewBrainSurface, NeverPaintsADeepMaximum) {
  const Vector3d deep(0, -25, 20);
  ASSERT_GT(depth_below_hull_mm(deep), 45);
  const auto [points, values] =
      lattice([&](const Vector3d& p) { return (p - deep).norm() < 15 ? 1.0 : 0.0; });
  ASSERT_EQ(values.maxCoeff(), 1);
  EXPECT_EQ(painted_values(drawn_brain(4), points, values, 7).maxCoeff(), 0);
}

TEST(ViewBrainSurface, KeepsAConstantMap) {
  const auto [points, values] = lattice([](const Vector3d&) { return 3.0; });
  const Eigen::VectorXd painted = painted_values(drawn_brain(4), points, values, 7);
  EXPECT_NEAR(painted.maxCoeff(), 3, 1e-12);
}

TEST(ViewBrainSurface, MirroredMapGivesMirroredPaint) {
  const auto [points, values] =
      lattice([](const Vector3d& p) { return p.x() > 20 ? p.y() + 200 : 50 + p.z(); });
  Eigen::Matrix3Xd mirrored = points;
  mirrored.row(0) *= -1;
  const SurfaceMesh mesh = drawn_brain(3);
  const Eigen::VectorXd a = painted_values(mesh, points, values, 7),
                        b = painted_values(mesh, mirrored, values, 7);
  for (Eigen::Index v = 0; v < a.size(); ++v) {
    const Vector3d opposite = mesh.vertices_mm.col(v).cwiseProduct(Vector3d(-1, 1, 1));
    Eigen::Index w = 0;
    (mesh.vertices_mm.colwise() - opposite).colwise().norm().minCoeff(&w);
    EXPECT_NEAR(a(v), b(w), 1e-6 * 300);
  }
}

TEST(ViewBrainSurface, DepthsAreWaysToTheHull) {
  // Hull radii of the template along +z and +x from the head centre: 84.007 and 71.496 mm.
  EXPECT_NEAR(depth_below_hull_mm({0, -15.4, -2.8 + 70}), 14.007, 0.001);
  EXPECT_NEAR(depth_below_hull_mm({71.496 + 5, -15.4, -2.8}), -5, 0.001);
  EXPECT_NEAR(depth_seen_mm({0, -15.4, -2.8 + 70}, Vector3d::UnitZ()), 14.007, 0.02);
  EXPECT_NEAR(depth_seen_mm({20, -15.4, -2.8}, Vector3d::UnitX()), 51.496, 0.02);
  EXPECT_NEAR(depth_seen_mm({20, -15.4, -2.8}, -Vector3d::UnitX()), 91.496, 0.02);
  EXPECT_EQ(depth_seen_mm({0, 0, 120}, Vector3d::UnitZ()), 0);
}

}  // namespace
}  // namespace headwater
