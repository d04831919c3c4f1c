// SPDX-License-Identifier: GPL-3.0-or-later
// 1. Points further from the median of the coordinates than three times the median distance are no
//    part of a head (across a whole sphere the ratio is at most two) and are left out.
// 2. Least trimmed squares by concentration steps (Rousseeuw & Van Driessen 2006 Data Min Knowl
//    Disc 12:29): fit, keep the three quarters with the smallest residuals, fit again ...; each
//    step lowers the sum, so that it ends. Start: least squares; no random numbers, no order of
//    points.
// 3. From there least squares over all points within the limit, until the set stays the same.
#include "robust_sphere.hpp"

#include <headwater/base/error.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <cmath>

namespace headwater {
namespace {

constexpr double kFarOff = 3;          // median distances from the median
constexpr double kKept = 0.75;         // share of points in the concentration steps
constexpr double kSpreads = 5;         // robust spreads that make an outlier ...
constexpr double kLeastLimit = 15e-3;  // ... but no less than this, m
constexpr int kMostRounds = 50;
constexpr Eigen::Index kFewest = 8;  // points below which nothing is left out

using Mask = std::vector<bool>;

double median(Eigen::ArrayXd values) {
  double* middle = values.data() + values.size() / 2;
  std::nth_element(values.data(), middle, values.data() + values.size());
  return *middle;
}

Mask at_most(const Eigen::ArrayXd& values, double limit) {
  Mask mask(static_cast<std::size_t>(values.size()));
  for (std::size_t i = 0; i < mask.size(); ++i)
    mask[i] = values[static_cast<Eigen::Index>(i)] <= limit;
  return mask;
}

Eigen::Matrix3Xd chosen(const Eigen::Matrix3Xd& points, const Mask& mask) {
  std::vector<Eigen::Index> columns;
  for (std::size_t i = 0; i < mask.size(); ++i)
    if (mask[i]) columns.push_back(static_cast<Eigen::Index>(i));
  return points(Eigen::all, columns);
}

SphereFit fit_chosen(const Eigen::Matrix3Xd& points, const Mask& mask) {
  SphereFit fit = fit_sphere(chosen(points, mask));
  fit.residual = (points.colwise() - fit.centre).colwise().norm().transpose().array() - fit.radius;
  return fit;
}

Mask near_the_middle(const Eigen::Matrix3Xd& points) {
  Eigen::Vector3d middle;
  for (Eigen::Index axis = 0; axis < 3; ++axis)
    middle[axis] = median(points.row(axis).transpose().array());
  const Eigen::ArrayXd distance = (points.colwise() - middle).colwise().norm().transpose();
  return at_most(distance, kFarOff * median(distance));
}

double limit_of(const SphereFit& fit) {
  return std::max(kLeastLimit, kSpreads * 1.4826 * median(fit.residual.array().abs()));
}

/// Step 2: the fit from which the limit is taken first.
SphereFit concentrated(const Eigen::Matrix3Xd& points, SphereFit fit) {
  const auto kept =
      static_cast<Eigen::Index>(std::ceil(kKept * static_cast<double>(points.cols())));
  Mask before;
  for (int round = 0; round < kMostRounds; ++round) {
    Eigen::ArrayXd sorted = fit.residual.array().abs();
    std::sort(sorted.data(), sorted.data() + sorted.size());
    const Mask mask = at_most(fit.residual.array().abs(), sorted[kept - 1]);
    if (mask == before) break;
    try {
      fit = fit_chosen(points, mask);
    } catch (const InputError&) {
      break;  // the points kept lie in one plane: the last fit has to do
    }
    before = mask;
  }
  return fit;
}

}  // namespace

RobustSphere fit_robust_sphere(const Eigen::Matrix3Xd& points) {
  RobustSphere sphere;
  sphere.inside.assign(static_cast<std::size_t>(points.cols()), true);
  if (points.cols() < kFewest || !points.allFinite()) {
    sphere.fit = fit_sphere(points);
    return sphere;
  }
  SphereFit fit = concentrated(points, fit_chosen(points, near_the_middle(points)));
  for (int round = 0; round < kMostRounds; ++round) {
    const Mask mask = at_most(fit.residual.array().abs(), limit_of(fit));
    if (round > 0 && mask == sphere.inside) break;
    sphere.inside = mask;
    fit = fit_chosen(points, mask);
  }
  sphere.fit = fit;
  return sphere;
}

RobustSphere fit_head(const Eigen::Matrix3Xd& points, const std::string& source) {
  try {
    return fit_robust_sphere(points);
  } catch (const InputError& error) {
    throw InputError(fmt::format("{}: no sphere through the electrodes: {}", source, error.what()));
  }
}

bool is_head_radius(double radius_m) {
  return radius_m >= 60e-3 && radius_m <= 140e-3;
}

}  // namespace headwater
