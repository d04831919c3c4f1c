// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/convex_hull.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/random.hpp>
#include <headwater/base/sphere_fit.hpp>

#include <Eigen/Dense>
#include <gtest/gtest.h>

#include <algorithm>
#include <map>
#include <numeric>

namespace headwater {
namespace {

Eigen::Matrix3Xd unit_directions(Eigen::Index count, std::string_view name) {
  Eigen::Matrix3Xd points = RandomStream(5, name).normal_matrix(3, count);
  points.colwise().normalize();
  return points;
}

// Exact points: errors are a few roundings of the coordinates, whatever the unit; 64 eps of the
// size.
TEST(BaseSphereFit, FindsAnExactSphereInAnyUnit) {
  for (const double unit : {1e-8, 1.0, 1e8})
    for (const Eigen::Index count : {4, 5, 64}) {
      const Eigen::Vector3d centre = unit * Eigen::Vector3d(3, -17, 40);
      const Eigen::Matrix3Xd points =
          (92 * unit * unit_directions(count, "exact")).colwise() + centre;
      const SphereFit fit = fit_sphere(points);
      EXPECT_TRUE(fit.converged);
      EXPECT_NEAR(fit.radius, 92 * unit, 1e-12 * 92 * unit);
      EXPECT_LT((fit.centre - centre).norm(), 1e-12 * 92 * unit);
      EXPECT_LT(fit.rms, 64 * 2.3e-16 * 140 * unit);
    }
}

// At the minimum the gradient of the cost is 0: sum f = 0 (radius) and sum f (x-c)/d = 0 (centre).
TEST(BaseSphereFit, MinimisesTheGeometricCostOfANoisyCap) {
  Eigen::Matrix3Xd points = unit_directions(60, "cap");
  points.row(2) = points.row(2).cwiseAbs();  // upper half only, as a cap
  points = 92 * points + 3 * RandomStream(6, "noise").normal_matrix(3, 60);
  const SphereFit fit = fit_sphere(points);
  EXPECT_TRUE(fit.converged);
  const Eigen::Matrix3Xd from_centre = points.colwise() - fit.centre;
  const Eigen::VectorXd distance = from_centre.colwise().norm();
  EXPECT_LT((fit.residual - (distance.array() - fit.radius).matrix()).norm(), 1e-10);
  EXPECT_NEAR(fit.residual.sum(), 0, 1e-9);
  // The iteration ends at a step of 1e-12 radius; a step moves the gradient by at most its length
  // times the number of points, and linear convergence leaves a few steps' length: ten.
  EXPECT_LT((from_centre * fit.residual.cwiseQuotient(distance)).norm() / 92, 10 * 60 * 1e-12 * 92);
  EXPECT_NEAR(fit.rms, std::sqrt(fit.residual.squaredNorm() / 60), 1e-12);
  EXPECT_NEAR(fit.radius, 92, 5);
}

TEST(BaseSphereFit, RefusesPlanesAndTooFewPoints) {
  Eigen::Matrix3Xd flat = unit_directions(20, "flat");
  flat.row(1).setConstant(7);
  EXPECT_THROW(fit_sphere(flat), InputError);
  EXPECT_THROW(fit_sphere(unit_directions(3, "few")), InputError);
  EXPECT_THROW(fit_sphere(Eigen::Matrix3Xd::Constant(3, 8, 2.0)), InputError);
  Eigen::Matrix3Xd broken = unit_directions(8, "nan");
  broken(1, 4) = std::nan("");
  EXPECT_THROW(fit_sphere(broken), InputError);
}

// Brute force: every point lies on or below the plane of every triangle; with all points on the
// sphere Euler's formula gives 2 n - 4 triangles, and each edge has one triangle on either side.
TEST(BaseConvexHull, IsTheHullAndLooksOutwards) {
  for (const Eigen::Index count : {4, 7, 65}) {
    const Eigen::Matrix3Xd points = unit_directions(count, "hull");
    const Eigen::Matrix3Xi triangles = convex_hull_triangles(points);
    ASSERT_EQ(triangles.cols(), 2 * count - 4);
    std::map<std::pair<int, int>, int> edges;
    for (Eigen::Index t = 0; t < triangles.cols(); ++t) {
      const Eigen::Vector3d a = points.col(triangles(0, t));
      const Eigen::Vector3d normal =
          (points.col(triangles(1, t)) - a).cross(points.col(triangles(2, t)) - a);
      EXPECT_LE((normal.transpose() * (points.colwise() - a)).maxCoeff(), 1e-14);
      for (int i = 0; i < 3; ++i) ++edges[{triangles(i, t), triangles((i + 1) % 3, t)}];
    }
    for (const auto& [edge, times] : edges) {
      EXPECT_EQ(times, 1);
      EXPECT_EQ(edges.count({edge.second, edge.first}), 1u);
    }
  }
}

TEST(BaseConvexHull, LeavesInnerPointsOut) {
  Eigen::Matrix3Xd points(3, 7);
  points.leftCols<6>() << Eigen::Matrix3d::Identity(), -Eigen::Matrix3d::Identity();
  points.col(6) << 0.1, 0.2, -0.1;
  const Eigen::Matrix3Xi triangles = convex_hull_triangles(points);
  EXPECT_EQ(triangles.cols(), 8);
  EXPECT_LT(triangles.maxCoeff(), 6);
  const auto neighbours = triangle_neighbours(triangles, points, 10);
  EXPECT_EQ(neighbours[0], (std::vector<Eigen::Index>{1, 2, 4, 5}));  // all but its opposite
  EXPECT_TRUE(neighbours[6].empty());
}

// Corners of a cube lie in fours on a circle: the diagonals must not depend on the points' order.
TEST(BaseConvexHull, DoesNotDependOnTheOrderOfPoints) {
  Eigen::Matrix3Xd cube(3, 8);
  for (int i = 0; i < 8; ++i) cube.col(i) << (i & 1), ((i >> 1) & 1), (i >> 2);
  const auto neighbours = triangle_neighbours(convex_hull_triangles(cube), cube, 10);
  RandomStream random(9, "order");
  std::vector<Eigen::Index> order(8);
  std::iota(order.begin(), order.end(), 0);
  for (int repeat = 0; repeat < 10; ++repeat) {
    for (std::size_t i = 7; i > 0; --i) std::swap(order[i], order[random.bits() % (i + 1)]);
    Eigen::Matrix3Xd mixed(3, 8);
    for (std::size_t i = 0; i < 8; ++i)
      mixed.col(static_cast<Eigen::Index>(i)) = cube.col(order[i]);
    const auto found = triangle_neighbours(convex_hull_triangles(mixed), mixed, 10);
    for (std::size_t i = 0; i < 8; ++i) {
      std::vector<Eigen::Index> names;
      for (const auto j : found[i]) names.push_back(order[static_cast<std::size_t>(j)]);
      std::sort(names.begin(), names.end());
      EXPECT_EQ(names, neighbours[static_cast<std::size_t>(order[i])]);
    }
  }
  // Only the cube's own edges are short enough: three for each corner.
  for (const auto& near : triangle_neighbours(convex_hull_triangles(cube), cube, 1.2))
    EXPECT_EQ(near.size(), 3u);
}

TEST(BaseConvexHull, RefusesPlanesAndTooFewPoints) {
  Eigen::Matrix3Xd flat = unit_directions(20, "flat");
  flat.row(1).setConstant(7);
  EXPECT_THROW(convex_hull_triangles(flat), InputError);
  EXPECT_THROW(convex_hull_triangles(Eigen::Matrix3Xd::Constant(3, 8, 2.0)), InputError);
  EXPECT_THROW(convex_hull_triangles(unit_directions(3, "few")), InputError);
}

}  // namespace
}  // namespace headwater
