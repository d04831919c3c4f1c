// SPDX-License-Identifier: GPL-3.0-or-later
// Uses the installed library from code that was built for any x86-64: matrices are allocated on one
// side and freed or resized on the other, an exception crosses the border, and the client's own
// Eigen kernels must not take the place of the library's.
#include <headwater/base/error.hpp>
#include <headwater/base/sphere_fit.hpp>
#include <headwater/base/version.hpp>

#include <Eigen/Dense>

#include <cmath>
#include <cstdio>

namespace {

/// Points on a sphere about the centre, spread by the golden angle (any spread would do).
Eigen::Matrix3Xd sphere_points(int count, const Eigen::Vector3d& centre, double radius) {
  Eigen::Matrix3Xd points(3, count);
  for (int k = 0; k < count; ++k) {
    const double z = 1 - (2 * k + 1.0) / count, angle = 2.399963229728653 * k;
    const double s = std::sqrt(1 - z * z);
    points.col(k) = centre + radius * Eigen::Vector3d(s * std::cos(angle), s * std::sin(angle), z);
  }
  return points;
}

bool fit_is_exact() {
  const Eigen::Vector3d centre(0.004, -0.0154, -0.0028);
  bool exact = true;
  for (int count = 4; count < 200; ++count) {  // every remainder of the vector width
    headwater::SphereFit fit = headwater::fit_sphere(sphere_points(count, centre, 0.092));
    exact = exact && fit.converged && (fit.centre - centre).norm() < 1e-12 &&
            std::abs(fit.radius - 0.092) < 1e-12;
    fit.residual.conservativeResize(2 * count);  // the library's block, in the client's hands
  }
  return exact;
}

bool error_arrives() {
  try {
    headwater::fit_sphere(Eigen::Matrix3Xd::Zero(3, 3));
  } catch (const headwater::InputError&) {
    return true;
  }
  return false;
}

/// Instantiates the client's own product and decomposition kernels beside the library's.
bool own_products_agree() {
  const Eigen::MatrixXd a = Eigen::MatrixXd::Random(97, 97);
  const Eigen::MatrixXd product = a * a.partialPivLu().inverse();
  return (product - Eigen::MatrixXd::Identity(97, 97)).norm() < 1e-8;
}

}  // namespace

int main() {
  std::printf("client of headwater %s\n", headwater::version().c_str());
  const bool exact = fit_is_exact(), arrives = error_arrives(), agree = own_products_agree();
  std::printf("sphere fit %s, exception %s, own products %s\n", exact ? "exact" : "WRONG",
              arrives ? "arrives" : "LOST", agree ? "agree" : "DISAGREE");
  return exact && arrives && agree ? 0 : 1;
}
