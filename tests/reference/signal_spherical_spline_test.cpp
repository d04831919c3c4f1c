// SPDX-License-Identifier: GPL-3.0-or-later
// Perrin, Pernier, Bertrand & Echallier 1989 (Electroenceph Clin Neurophysiol 72:184; corrigendum
// 76:565) with m = 4, summed plainly with the Legendre polynomials of Boost.Math.
#include <headwater/base/units.hpp>
#include <headwater/signal/spherical_spline.hpp>

#include <boost/math/special_functions/legendre.hpp>
#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

/// 400 terms: the rest is below 2 / (6 * 400^6) = 1e-16 of 4 pi g.
double published_kernel(double x) {
  double sum = 0;
  for (int n = 400; n >= 1; --n)
    sum += (2 * n + 1) / std::pow(n * (n + 1.0), 4) * boost::math::legendre_p(n, x);
  return sum / (4 * kPi);
}

TEST(SignalSphericalSplineReference, KernelIsPerrins) {
  const double scale = published_kernel(1);
  for (int k = 0; k <= 40; ++k) {
    const double x = -1 + k / 20.0;
    EXPECT_NEAR(spline_kernel(x), published_kernel(x), 1e-8 * scale) << x;
  }
}

// By hand: 4 pi g(1) = 3/16 + 5/1296 + 7/20736 + 9/160000 + 11/810000 + ..., and 4 pi g(-1) is the
// same with signs that alternate from -; the terms from n = 6 on are below 13/42^4 = 4.2e-6 in all
// 7e-6 (they fall as n^-7).
TEST(SignalSphericalSplineReference, KernelByHandAtTheEnds) {
  const double a = 3 / 16.0, b = 5 / 1296.0, c = 7 / 20736.0, d = 9 / 160000.0, e = 11 / 810000.0;
  EXPECT_NEAR(4 * kPi * spline_kernel(1), a + b + c + d + e, 7e-6);
  EXPECT_NEAR(4 * kPi * spline_kernel(-1), -a + b - c + d - e, 7e-6);
  // x = 0: P_2 = -1/2, P_4 = 3/8, P_6 = -5/16, odd ones 0.
  EXPECT_NEAR(4 * kPi * spline_kernel(0), -b / 2 + 3 * d / 8, 2e-6);
}

// Electrodes at the vertices of an octahedron. By symmetry the patterns are the constant, the odd
// ones (V_x = -V_-x; eigenvalue g(1) - g(-1)) and the even ones without mean (eigenvalue
// g(1) + g(-1) - 2 g(0)). With c = u . x, e_x = g(c) + g(-c), its mean over the axes e:
//   weight of +-x = ( 1/3 + (e_x - e) / (g(1) + g(-1) - 2 g(0)) )/2
//                   +- (g(c) - g(-c)) / (g(1) - g(-1)) / 2.
TEST(SignalSphericalSplineReference, OctahedronHasWeightsInClosedForm) {
  Eigen::Matrix3Xd from(3, 6);
  from << Eigen::Matrix3d::Identity(), -Eigen::Matrix3d::Identity();
  Eigen::Matrix3Xd to(3, 5);
  to << 1, 0.3, -0.2, 0, 1, 1, -0.5, 0.9, 0, 0.01, 1, 0.8, 0.4, -1, -0.02;
  const Eigen::MatrixXd p = spline_interpolation(from, to);
  const auto g = published_kernel;
  const double odd = g(1) - g(-1), even = g(1) + g(-1) - 2 * g(0);
  for (Eigen::Index k = 0; k < to.cols(); ++k) {
    const Eigen::Vector3d u = to.col(k).normalized();
    Eigen::Vector3d sums;
    for (int axis = 0; axis < 3; ++axis) sums(axis) = g(u(axis)) + g(-u(axis));
    for (int axis = 0; axis < 3; ++axis) {
      const double mean = (1.0 / 3 + (sums(axis) - sums.mean()) / even) / 2;
      const double difference = (g(u(axis)) - g(-u(axis))) / odd / 2;
      EXPECT_NEAR(p(k, axis), mean + difference, 2e-7);  // kernels to 1e-8 of g(1), even = g(1)/25
      EXPECT_NEAR(p(k, axis + 3), mean - difference, 2e-7);
    }
  }
}

}  // namespace
}  // namespace headwater
