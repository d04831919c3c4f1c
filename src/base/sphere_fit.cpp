// SPDX-License-Identifier: GPL-3.0-or-later
// Points are centred on their mean and divided by their root mean square distance from it, so that
// all thresholds are relative. Start (Coope): |x|^2 = 2 c.x + (r^2 - |c|^2), linear least squares.
// Gauss-Newton on f_i = d_i - r, d_i = |x_i - c|: rows of the Jacobian (-(x_i - c)/d_i, -1); a step
// that does not lower the cost is halved.
#include <headwater/base/error.hpp>
#include <headwater/base/sphere_fit.hpp>

#include <Eigen/Dense>
#include <fmt/core.h>

#include <algorithm>
#include <cmath>
#include <limits>

namespace headwater {
namespace {

constexpr double kFlat = 1e-9;       // thickness over width below which points count as one plane
constexpr double kLastStep = 1e-12;  // of the radius
constexpr int kMostSteps = 200;

using Points = Eigen::Matrix3Xd;

Eigen::VectorXd residual(const Points& x, const Eigen::Vector4d& sphere) {
  return (x.colwise() - sphere.head<3>()).colwise().norm().transpose().array() - sphere(3);
}

Eigen::Vector4d algebraic_fit(const Points& x) {
  Eigen::MatrixX4d a(x.cols(), 4);
  a.leftCols<3>() = 2 * x.transpose();
  a.col(3).setOnes();
  Eigen::Vector4d sphere = a.colPivHouseholderQr().solve(x.colwise().squaredNorm().transpose());
  sphere(3) = std::sqrt(std::max(0.0, sphere(3) + sphere.head<3>().squaredNorm()));
  return sphere;
}

/// Refines `sphere` (centre, radius); true when the last step was small enough.
bool refine(const Points& x, Eigen::Vector4d& sphere) {
  Eigen::VectorXd f = residual(x, sphere);
  Eigen::MatrixX4d jacobian(x.cols(), 4);
  for (int iteration = 0; iteration < kMostSteps; ++iteration) {
    const Points from_centre = x.colwise() - sphere.head<3>();
    // A point on the centre has no direction: any will do, the smallest distance keeps it finite.
    const Eigen::ArrayXd distance =
        from_centre.colwise().norm().transpose().array().max(std::numeric_limits<double>::min());
    jacobian.leftCols<3>() = -(from_centre.transpose().array().colwise() / distance).matrix();
    jacobian.col(3).setConstant(-1);
    Eigen::Vector4d step = jacobian.colPivHouseholderQr().solve(-f);
    Eigen::VectorXd next = residual(x, sphere + step);
    // Rounding alone may raise the cost of a step at the minimum: that much is let pass.
    const double ceiling = f.squaredNorm() + 1e-24 * static_cast<double>(x.cols());
    while (next.squaredNorm() > ceiling && step.norm() > kLastStep * sphere(3)) {
      step /= 2;
      next = residual(x, sphere + step);
    }
    sphere += step;
    f = next;
    if (step.norm() < kLastStep * sphere(3)) return true;
  }
  return false;
}

}  // namespace

SphereFit fit_sphere(const Eigen::Ref<const Eigen::Matrix3Xd>& points) {
  if (points.cols() < 4)
    throw InputError(fmt::format("sphere fit: {} points, at least 4 expected.", points.cols()));
  if (!points.allFinite()) throw InputError("sphere fit: a coordinate is not a finite number.");
  const Eigen::Vector3d mean = points.rowwise().mean();
  Points x = points.colwise() - mean;
  const double scale = x.norm() / std::sqrt(static_cast<double>(x.cols()));
  if (scale > 0) x /= scale;
  const Eigen::Vector3d width = Eigen::JacobiSVD<Eigen::MatrixXd>(x).singularValues();
  if (!(width(2) > kFlat * width(0)))
    throw InputError(
        "sphere fit: all points lie in one plane; positions around the head are expected.");

  Eigen::Vector4d sphere = algebraic_fit(x);
  SphereFit fit;
  fit.converged = refine(x, sphere);
  fit.centre = mean + scale * sphere.head<3>();
  fit.radius = scale * sphere(3);
  fit.residual = scale * residual(x, sphere);
  fit.rms = fit.residual.norm() / std::sqrt(static_cast<double>(points.cols()));
  return fit;
}

}  // namespace headwater
