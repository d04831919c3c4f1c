// SPDX-License-Identifier: GPL-3.0-or-later
#include "view/axis_ticks.hpp"

#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

TEST(ViewAxisTicks, RoundStepsFromZeroThatHoldTheLargestValue) {
  for (const double largest : {1e-9, 0.037, 0.1, 0.99, 1.0, 3.7, 7.4, 8.0, 42.0, 999.0, 1e8}) {
    const TickScale scale = tick_scale(largest, 4);
    EXPECT_GE(scale.top, largest * (1 - 1e-9));
    EXPECT_LE(scale.top, largest + scale.step / 2 * (1 + 1e-9)) << largest;
    const double digit = scale.step / std::pow(10, std::floor(std::log10(scale.step * (1 + 1e-9))));
    EXPECT_TRUE(std::abs(digit - 1) < 1e-6 || std::abs(digit - 2) < 1e-6 ||
                std::abs(digit - 5) < 1e-6)
        << largest << ": step " << scale.step;
    const auto ticks = scale.ticks();
    EXPECT_EQ(ticks.front(), 0);
    EXPECT_GE(ticks.size(), 3u) << largest;
    EXPECT_LE(ticks.size(), 6u) << largest;
  }
}

TEST(ViewAxisTicks, TextsHaveTheDecimalsOfTheStep) {
  EXPECT_EQ(tick_scale(7.4, 4).text(2), "2");
  EXPECT_EQ(tick_scale(0.37, 4).text(0.1), "0.1");
  EXPECT_EQ(tick_scale(0.09, 4).text(0.06), "0.06");
  EXPECT_EQ(tick_scale(900, 4).text(500), "500");
  EXPECT_EQ(tick_scale(2e6, 4).text(5e5), "5e+05");
  EXPECT_EQ(tick_scale(3, 4).text(0), "0");
}

TEST(ViewAxisTicks, NothingGivesZeroToOne) {
  EXPECT_EQ(tick_scale(0, 4).top, 1);
}

}  // namespace
}  // namespace headwater
