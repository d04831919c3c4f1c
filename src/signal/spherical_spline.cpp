// SPDX-License-Identifier: GPL-3.0-or-later
// With G_ij = g(e_i . e_j) the coefficients (c, c_0) solve the bordered system
//   K (c, c_0) = (V, 0),  K = [ G 1 ; 1' 0 ],
// so that V(to) = [ G(to, from) 1 ] K^-1 (V, 0).
//
// Leaving a lead out: let S be the first M rows and columns of K^-1. The surface through all other
// leads has c_i = 0, and there is a value v of lead i, the prediction, that makes the full system
// give just that: 0 = c_i = S_ii v + sum_{j != i} S_ij V_j. Hence v = -sum_{j != i} S_ij / S_ii
// V_j.
#include <headwater/base/error.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/spherical_spline.hpp>

#include <Eigen/LU>
#include <fmt/core.h>

#include <algorithm>
#include <cmath>

namespace headwater {
namespace {

/// The terms fall as n^-7: those beyond 40 add less than 1e-8 of g(1).
constexpr int kTerms = 40;
constexpr Eigen::Index kFewestElectrodes = 4;
/// Electrodes nearer than this (1e-4 rad: 10 um on a head) make the system singular in rounding.
constexpr double kNearest = 1e-4;

double kernel_between(const Eigen::Vector3d& a, const Eigen::Vector3d& b) {
  return spline_kernel(std::clamp(a.dot(b), -1.0, 1.0));
}

Eigen::Matrix3Xd unit_directions(const Eigen::Matrix3Xd& directions) {
  Eigen::Matrix3Xd unit = directions;
  for (Eigen::Index i = 0; i < unit.cols(); ++i) {
    const double length = unit.col(i).norm();
    if (!(length > 0) || !std::isfinite(length))
      throw InputError(
          fmt::format("Spherical spline: electrode {} has no direction (its position is the "
                      "centre, or no number).",
                      i + 1));
    unit.col(i) /= length;
  }
  return unit;
}

/// Inverse of K for unit directions.
Eigen::MatrixXd bordered_inverse(const Eigen::Matrix3Xd& e) {
  const Eigen::Index count = e.cols();
  if (count < kFewestElectrodes)
    throw InputError(fmt::format("Spherical spline: {} electrodes, at least {} are needed.", count,
                                 kFewestElectrodes));
  Eigen::MatrixXd system = Eigen::MatrixXd::Ones(count + 1, count + 1);
  system(count, count) = 0;
  for (Eigen::Index i = 0; i < count; ++i)
    for (Eigen::Index j = 0; j <= i; ++j) {
      if (j < i && (e.col(i) - e.col(j)).norm() < kNearest)
        throw InputError(fmt::format(
            "Spherical spline: electrodes {} and {} lie in the same direction; leave one out.",
            j + 1, i + 1));
      system(i, j) = system(j, i) = kernel_between(e.col(i), e.col(j));
    }
  return system.partialPivLu().inverse();
}

}  // namespace

double spline_kernel(double x) {
  double before = 1, legendre = x, sum = 0;
  for (int n = 1; n <= kTerms; ++n) {
    const double curvature = n * (n + 1.0);
    sum += (2 * n + 1) / (curvature * curvature * curvature * curvature) * legendre;
    const double next = ((2 * n + 1) * x * legendre - n * before) / (n + 1);
    before = legendre;
    legendre = next;
  }
  return sum / (4 * kPi);
}

Eigen::MatrixXd spline_interpolation(const Eigen::Matrix3Xd& from, const Eigen::Matrix3Xd& to) {
  const Eigen::Matrix3Xd e = unit_directions(from), u = unit_directions(to);
  const Eigen::Index count = e.cols();
  const Eigen::MatrixXd coefficients = bordered_inverse(e).leftCols(count);
  Eigen::MatrixXd kernels = Eigen::MatrixXd::Ones(u.cols(), count + 1);
  for (Eigen::Index j = 0; j < count; ++j)
    for (Eigen::Index i = 0; i < u.cols(); ++i) kernels(i, j) = kernel_between(u.col(i), e.col(j));
  return kernels * coefficients;
}

Eigen::MatrixXd spline_prediction(const Eigen::Matrix3Xd& directions) {
  const Eigen::Index count = directions.cols();
  if (count <= kFewestElectrodes)
    throw InputError(fmt::format(
        "Spherical spline: {} electrodes, at least {} are needed to predict each from the others.",
        count, kFewestElectrodes + 1));
  const Eigen::MatrixXd inverse = bordered_inverse(unit_directions(directions));
  Eigen::MatrixXd prediction(count, count);
  for (Eigen::Index i = 0; i < count; ++i) {
    prediction.row(i) = -inverse.row(i).head(count) / inverse(i, i);
    prediction(i, i) = 0;
  }
  return prediction;
}

}  // namespace headwater
