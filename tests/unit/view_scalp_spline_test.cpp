// SPDX-License-Identifier: GPL-3.0-or-later
#include "view/scalp_spline.hpp"

#include <headwater/base/units.hpp>

#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

/// Sites spread evenly over the sphere above z = -0.3 (golden-angle spiral).
Eigen::Matrix3Xd sites(int count) {
  Eigen::Matrix3Xd result(3, count);
  for (int i = 0; i < count; ++i) {
    const double z = 1 - 1.3 * (i + 0.5) / count, angle = 2.399963229728653 * i;
    const double across = std::sqrt(1 - z * z);
    result.col(i) << across * std::cos(angle), across * std::sin(angle), z;
  }
  return result;
}

// The solve of a system with condition below 1e7 at n = 60 leaves 1e-9 of the values.
TEST(ViewScalpSpline, PassesThroughTheMeasuredValues) {
  const Eigen::Matrix3Xd e = sites(60);
  const Eigen::VectorXd v =
      (3 * e.row(0).array() + (7 * e.row(1).array()).sin() - e.row(2).array()).transpose();
  const ScalpSpline spline(e * 0.092, v);  // any length of direction
  for (int i = 0; i < 60; ++i) EXPECT_NEAR(spline(2 * e.col(i)), v(i), 1e-8);
}

TEST(ViewScalpSpline, KeepsAConstant) {
  const ScalpSpline spline(sites(20), Eigen::VectorXd::Constant(20, -2.5));
  for (const Eigen::Vector3d& u : {Eigen::Vector3d(1, 2, 3), Eigen::Vector3d(-1, 0.2, 0)})
    EXPECT_NEAR(spline(u), -2.5, 1e-9);
}

// A field of low degree, measured densely, is found between the sites: 60 sites are 0.37 rad apart,
// and a spline of order 4 errs by about (0.37 k / pi)^4 of a degree-k term: 4e-3 for k = 2,
// doubled.
TEST(ViewScalpSpline, FindsASmoothFieldBetweenTheSites) {
  const Eigen::Matrix3Xd e = sites(60);
  const auto field = [](const Eigen::Vector3d& u) { return u.x() * u.z() + 0.5 * u.y(); };
  Eigen::VectorXd v(60);
  for (int i = 0; i < 60; ++i) v(i) = field(e.col(i));
  const ScalpSpline spline(e, v);
  for (const Eigen::Vector3d& u : {Eigen::Vector3d(0.3, 0.4, 0.8), Eigen::Vector3d(-0.7, 0.2, 0.5),
                                   Eigen::Vector3d(0.5, -0.6, 0.4)})
    EXPECT_NEAR(spline(u), field(u.normalized()), 8e-3);
}

TEST(ViewScalpSpline, FlatMapHasNoseUpAndRightOnTheRight) {
  EXPECT_TRUE(flat_position({0, 0, 5}).isZero());
  EXPECT_TRUE(flat_position({2, 0, 0}).isApprox(Eigen::Vector2d(kPi / 2, 0)));    // T8
  EXPECT_TRUE(flat_position({0, 1, 0}).isApprox(Eigen::Vector2d(0, kPi / 2)));    // Fpz
  EXPECT_TRUE(flat_position({-1, 0, 1}).isApprox(Eigen::Vector2d(-kPi / 4, 0)));  // C3
}

TEST(ViewScalpSpline, FlatMapIsUndone) {
  for (const Eigen::Vector3d& u :
       {Eigen::Vector3d(0.3, 0.4, 0.8), Eigen::Vector3d(-0.7, 0.2, -0.5), Eigen::Vector3d(0, 0, 1)})
    EXPECT_TRUE(unflattened(flat_position(u)).isApprox(u.normalized(), 1e-14));
}

}  // namespace
}  // namespace headwater
