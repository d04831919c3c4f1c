// SPDX-License-Identifier: GPL-3.0-or-later
// Shell factors against printed values and against the boundary conditions solved as they stand.
#include "model_shell_boundary.hpp"

#include <headwater/base/random.hpp>
#include <headwater/model/head.hpp>
#include <headwater/model/sphere_series.hpp>

#include <gtest/gtest.h>

namespace headwater {
namespace {

HeadModel three_shells(double ratio) {
  HeadModel head;
  head.radii_m = Eigen::VectorXd{{0.080, 0.085, 0.092}};
  head.conductivity_S_per_m = Eigen::VectorXd{{0.33, 0.33 / ratio, 0.33}};
  return head;
}

HeadModel random_head(RandomStream& random, Eigen::Index shells) {
  HeadModel head;
  head.radii_m.resize(shells);
  head.conductivity_S_per_m.resize(shells);
  double share = 1;
  for (Eigen::Index k = shells; k-- > 0; share *= 0.8 + 0.19 * random.uniform()) {
    head.radii_m[k] = 0.092 * share;
    head.conductivity_S_per_m[k] = std::pow(10, -2.5 + 3 * random.uniform());
  }
  return head;
}

// Source: computed from the product of the 2 x 2 shell matrices (Zhang 1995 Phys Med Biol 40:335)
// by two independent derivations; radii 8.0/8.5/9.2 cm, 0.33 S/m, ratio 80. Five printed digits.
TEST(SphereSeries, PrintedFactorsOfThreeShells) {
  const Eigen::VectorXd f = shell_factors(three_shells(80), 20);
  EXPECT_NEAR(f[0], 0.65664, 0.5e-5);
  EXPECT_NEAR(f[1], 0.40071, 0.5e-5);
  EXPECT_NEAR(f[4], 0.15718, 0.5e-5);
  EXPECT_NEAR(f[19], 0.05509, 0.5e-5);
}

// Source: as above; 0.0488 is 4 s / (1 + s)^2 with s = 80.
TEST(SphereSeries, FactorsTendToTheLimit) {
  const HeadModel head = three_shells(80);
  EXPECT_NEAR(shell_factor_limit(head), 4 * 80.0 / (81 * 81), 1e-15);
  const Eigen::VectorXd f = shell_factors(head, 5000);
  ASSERT_TRUE(f.allFinite());
  EXPECT_GE((f.array() - shell_factor_limit(head)).minCoeff(), 0);
  // Once the shells are thick against R/n, only the interfaces are left: factors (2n+1)/(n + (n+1)
  // s), which tend to the limit as 1/n^2 here.
  const double n = 5000, s = 1 / 80.0;
  EXPECT_NEAR(f[4999] / ((2 * n + 1) / (n + (n + 1) * s) * (2 * n + 1) / (n + (n + 1) / s)), 1,
              1e-14);
  EXPECT_NEAR(f[4999] / shell_factor_limit(head), 1, 20 / (n * n));
}

TEST(SphereSeries, BoundaryConditionsOfRandomShells) {
  RandomStream random(1, "sphere series");
  for (Eigen::Index shells = 1; shells <= 6; ++shells)
    for (int repeat = 0; repeat < 4; ++repeat) {
      const HeadModel head = random_head(random, shells);
      const Eigen::VectorXd f = shell_factors(head, 600);
      for (const int n : {1, 2, 3, 7, 20, 60, 200, 600})
        EXPECT_NEAR(f[n - 1] / shell_factor_from_boundaries(head, n), 1, 1e-12)
            << shells << " shells, n = " << n;
    }
}

TEST(SphereSeries, EqualConductivitiesGiveOne) {
  HeadModel head = three_shells(1);
  EXPECT_LE((shell_factors(head, 500).array() - 1).abs().maxCoeff(), 20e-16);
  EXPECT_NEAR(shell_factor_limit(head), 1, 1e-15);
}

// A shell cut in two of the same conductivity is the same head; so are factors of conductivities
// that all grow alike.
TEST(SphereSeries, SplitShellsAndCommonFactors) {
  const HeadModel three = three_shells(25);
  HeadModel four;
  four.radii_m = Eigen::VectorXd{{0.080, 0.082, 0.085, 0.092}};
  four.conductivity_S_per_m = Eigen::VectorXd{{0.33, 0.33 / 25, 0.33 / 25, 0.33}};
  HeadModel scaled = three;
  scaled.conductivity_S_per_m *= 7;
  scaled.radii_m *= 1.3;
  const Eigen::VectorXd f = shell_factors(three, 300);
  EXPECT_LE((shell_factors(four, 300).array() / f.array() - 1).abs().maxCoeff(), 1e-13);
  EXPECT_LE((shell_factors(scaled, 300).array() / f.array() - 1).abs().maxCoeff(), 1e-13);
}

}  // namespace
}  // namespace headwater
