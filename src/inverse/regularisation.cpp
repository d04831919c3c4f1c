// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/error.hpp>
#include <headwater/inverse/regularisation.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <cmath>
#include <functional>
#include <limits>

namespace headwater {
namespace {

constexpr int kSearchPoints = 201;

/// Where lambda is searched.
struct Range {
  double low, high;
  double at(double position) const {  // position 0 ... kSearchPoints - 1, logarithmic
    return low * std::pow(high / low, position / (kSearchPoints - 1));
  }
};

/// Minimum of f over log(lambda): grid, then golden section around the best point.
struct Minimum {
  double lambda;
  bool at_edge;
};

Minimum minimise(const std::function<double(double)>& f, const Range& range) {
  const auto lambda_at = [&](double position) { return range.at(position); };
  int best = 0;
  double lowest = std::numeric_limits<double>::infinity();
  for (int i = 0; i < kSearchPoints; ++i) {
    const double value = f(lambda_at(i));
    if (value < lowest) {
      lowest = value;
      best = i;
    }
  }
  if (best == 0 || best == kSearchPoints - 1) return {lambda_at(best), true};
  constexpr double kGolden = 0.6180339887498949;
  double low = best - 1, high = best + 1;
  double left = high - kGolden * (high - low), right = low + kGolden * (high - low);
  double f_left = f(lambda_at(left)), f_right = f(lambda_at(right));
  for (int step = 0; step < 30; ++step) {  // 2 grid steps times 0.618^30: 1e-6 of a grid step
    if (f_left < f_right) {
      high = right;
      right = left;
      f_right = f_left;
      f_left = f(lambda_at(left = high - kGolden * (high - low)));
    } else {
      low = left;
      left = right;
      f_left = f_right;
      f_right = f(lambda_at(right = low + kGolden * (high - low)));
    }
  }
  return {lambda_at((low + high) / 2), false};
}

/// Curvature of the L-curve (x = log rho, y = log eta) at lambda, positive at a corner, with
/// rho = sum f^2 z2 (residual), eta = sum d/(d+lambda)^2 z2 (solution), f = lambda/(d+lambda).
/// Derivatives by u = log lambda in closed form: df/du = f (1-f).
double curvature(const Eigen::VectorXd& d, const Eigen::VectorXd& z2, double lambda) {
  const Eigen::ArrayXd sum = d.array() + lambda;
  const Eigen::ArrayXd f = lambda / sum, g = d.array() / sum;  // f + g = 1
  const Eigen::ArrayXd r0 = f.square() * z2.array();
  const double rho = r0.sum(), rho1 = (2 * g * r0).sum(),
               rho2 = (2 * (2 * g.square() - f * g) * r0).sum();
  const Eigen::ArrayXd e0 = d.array() / sum.square() * z2.array();
  const double eta = e0.sum(), eta1 = (-2 * f * e0).sum(),
               eta2 = ((4 * f.square() - 2 * f * g) * e0).sum();
  if (!(rho > 0) || !(eta > 0)) return 0;
  const double x1 = rho1 / rho, y1 = eta1 / eta;
  const double x2 = rho2 / rho - x1 * x1, y2 = eta2 / eta - y1 * y1;
  const double speed = std::pow(x1 * x1 + y1 * y1, 1.5);
  return speed > 0 ? (x1 * y2 - x2 * y1) / speed : 0;
}

/// Largest lambda whose mean squared residual is at most 1 (the noise), by bisection of its
/// logarithm: the residual grows with lambda. NaN where the data stay below the noise, or above it
/// everywhere.
double discrepancy(const Eigen::VectorXd& d, const Eigen::VectorXd& z2, double samples,
                   const Range& range) {
  const auto residual = [&](double lambda) {
    const Eigen::ArrayXd f = lambda / (d.array() + lambda);
    return (f.square() * z2.array()).sum() / (samples * static_cast<double>(d.size()));
  };
  double low = 0, high = kSearchPoints - 1;
  if (residual(range.low) > 1 || residual(range.high) < 1)
    return std::numeric_limits<double>::quiet_NaN();
  for (int step = 0; step < 60; ++step) {
    const double middle = (low + high) / 2;
    (residual(range.at(middle)) > 1 ? high : low) = middle;
  }
  return range.at(low);
}

}  // namespace

RegularisationChoice choose_regularisation(const Eigen::VectorXd& eigenvalues,
                                           const Eigen::MatrixXd& z,
                                           const RegularisationRule& rule) {
  if (z.cols() == 0) throw InputError("No sample to choose the regularisation from.");
  const Eigen::VectorXd d = eigenvalues.cwiseMax(0);
  const Eigen::VectorXd z2 = z.rowwise().squaredNorm();
  // Exact zeros (a point on a node of symmetry) must not stretch the search without end.
  const double d_max = d.maxCoeff(), d_min = std::max(d.minCoeff(), 1e-12 * d_max);
  const Range range{d_min / 10, d_max * 10};
  RegularisationChoice choice;
  const auto gcv = minimise(
      [&](double lambda) {
        const Eigen::ArrayXd f = lambda / (d.array() + lambda);
        return (f.square() * z2.array()).sum() / (f.sum() * f.sum());
      },
      range);
  const auto corner = minimise([&](double lambda) { return -curvature(d, z2, lambda); }, range);
  choice.gcv = gcv.lambda;
  choice.gcv_at_edge = gcv.at_edge;
  choice.l_curve = corner.lambda;
  choice.l_curve_at_edge = corner.at_edge;
  choice.snr3 = d.mean() / 9;
  choice.discrepancy = discrepancy(d, z2, static_cast<double>(z.cols()), range);
  switch (rule.kind) {
    case RegularisationRule::Kind::gcv:
      choice.used = choice.gcv;
      choice.rule = "gcv";
      if (gcv.at_edge && gcv.lambda < d_max) {
        const bool reached = std::isfinite(choice.discrepancy);
        choice.used = reached ? choice.discrepancy : choice.snr3;
        choice.rule = reached ? "discrepancy (gcv has no minimum)" : "snr 3 (gcv has no minimum)";
      }
      break;
    case RegularisationRule::Kind::l_curve:
      choice.used = choice.l_curve;
      choice.rule = "l-curve";
      break;
    case RegularisationRule::Kind::snr:
      choice.used = d.mean() / (rule.value * rule.value);
      choice.rule = fmt::format("snr {:g}", rule.value);
      break;
    case RegularisationRule::Kind::lambda:
      choice.used = rule.value;
      choice.rule = "lambda";
      break;
  }
  choice.effective_parameters = (d.array() / (d.array() + choice.used)).sum();
  return choice;
}

}  // namespace headwater
