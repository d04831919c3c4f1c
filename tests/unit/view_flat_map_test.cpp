// SPDX-License-Identifier: GPL-3.0-or-later
#include "view/flat_map.hpp"

#include <headwater/base/units.hpp>

#include <gtest/gtest.h>

namespace headwater {
namespace {

TEST(ViewFlatMap, NoseIsUpAndRightOnTheRight) {
  EXPECT_TRUE(flat_position({0, 0, 5}).isZero());
  EXPECT_TRUE(flat_position({2, 0, 0}).isApprox(Eigen::Vector2d(kPi / 2, 0)));    // T8
  EXPECT_TRUE(flat_position({0, 1, 0}).isApprox(Eigen::Vector2d(0, kPi / 2)));    // Fpz
  EXPECT_TRUE(flat_position({-1, 0, 1}).isApprox(Eigen::Vector2d(-kPi / 4, 0)));  // C3
}

TEST(ViewFlatMap, IsUndone) {
  for (const Eigen::Vector3d& u :
       {Eigen::Vector3d(0.3, 0.4, 0.8), Eigen::Vector3d(-0.7, 0.2, -0.5), Eigen::Vector3d(0, 0, 1)})
    EXPECT_TRUE(unflattened(flat_position(u)).isApprox(u.normalized(), 1e-14));
}

}  // namespace
}  // namespace headwater
