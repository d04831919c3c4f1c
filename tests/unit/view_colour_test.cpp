// SPDX-License-Identifier: GPL-3.0-or-later
#include "view/colour.hpp"

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

namespace headwater {
namespace {

constexpr int kSteps = 256;

double distance(const Oklab& a, const Oklab& b) {
  return std::hypot(a.L - b.L, a.a - b.a, a.b - b.b);
}

// Oklab is defined so that D65 white is L = 1, a = b = 0 (Ottosson 2020); its ten-digit matrices
// hold that to a few 1e-8, and the cube root does not enlarge it.
TEST(ViewColour, WhiteIsTheOriginOfOklab) {
  const Oklab white = to_oklab({1, 1, 1});
  EXPECT_NEAR(white.L, 1, 1e-6);
  EXPECT_NEAR(white.a, 0, 1e-6);
  EXPECT_NEAR(white.b, 0, 1e-6);
  EXPECT_EQ(to_oklab({0, 0, 0}).L, 0);
}

// The two directions are separate sets of printed coefficients: they must undo each other to the
// digits printed (a wrong digit anywhere shows).
TEST(ViewColour, ConversionsUndoEachOther) {
  for (const Rgb& c :
       {Rgb{0.9, 0.2, 0.1}, Rgb{0.1, 0.7, 0.3}, Rgb{0.2, 0.1, 0.8}, Rgb{0.5, 0.5, 0.5}}) {
    const Rgb back = to_rgb(to_oklab(c));
    EXPECT_NEAR(back.red, c.red, 1e-5);
    EXPECT_NEAR(back.green, c.green, 1e-5);
    EXPECT_NEAR(back.blue, c.blue, 1e-5);
  }
}

TEST(ViewColour, AmplitudeDarkensAllTheWay) {
  double before = to_oklab(amplitude_colour(0)).L;
  EXPECT_GT(before, 0.9);
  for (int k = 1; k <= kSteps; ++k) {
    const double here = to_oklab(amplitude_colour(static_cast<double>(k) / kSteps)).L;
    EXPECT_LT(here, before) << "step " << k;
    before = here;
  }
  EXPECT_LT(before, 0.4);
}

// Constant speed along the curve: the chords of equal steps are equal but for the curve's bend
// (second order in 1/256) and the 1e-5 of the conversions; a clipped colour would break it.
TEST(ViewColour, EqualStepsOfAmplitudeLookEqual) {
  double least = 1, most = 0;
  for (int k = 0; k < kSteps; ++k) {
    const double step = distance(to_oklab(amplitude_colour(static_cast<double>(k) / kSteps)),
                                 to_oklab(amplitude_colour((k + 1.0) / kSteps)));
    least = std::min(least, step);
    most = std::max(most, step);
  }
  EXPECT_LT(most / least, 1.02);
}

TEST(ViewColour, BalanceIsSymmetricInLightness) {
  double before = to_oklab(balance_colour(0)).L;
  for (int k = 1; k <= kSteps; ++k) {
    const double t = static_cast<double>(k) / kSteps;
    const Oklab above = to_oklab(balance_colour(t)), below = to_oklab(balance_colour(-t));
    EXPECT_NEAR(above.L, below.L, 1e-5) << t;
    EXPECT_LT(above.L, before) << t;
    before = above.L;
  }
}

// Blue against brown differ along the yellow-blue axis, which the common red-green deficiencies
// leave.
TEST(ViewColour, SignsDifferAlongTheYellowBlueAxis) {
  EXPECT_GT(to_oklab(balance_colour(0.5)).b, 0.05);
  EXPECT_LT(to_oklab(balance_colour(-0.5)).b, -0.05);
}

TEST(ViewColour, ValuesOutsideTakeTheEnds) {
  EXPECT_EQ(amplitude_colour(-1).red, amplitude_colour(0).red);
  EXPECT_EQ(amplitude_colour(2).blue, amplitude_colour(1).blue);
  EXPECT_EQ(balance_colour(-7).green, balance_colour(-1).green);
}

}  // namespace
}  // namespace headwater
