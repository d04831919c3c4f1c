// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/error.hpp>
#include <headwater/inverse/influence.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <cmath>
#include <vector>

namespace headwater {
namespace {

double median(std::vector<double> values) {
  const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
  std::nth_element(values.begin(), middle, values.end());
  return *middle;
}

/// rms over samples of each row times the root of its model precision, relative to the median row.
Eigen::VectorXd relative_misfit(const Eigen::MatrixXd& deleted, const Eigen::VectorXd& precision) {
  Eigen::VectorXd misfit = deleted.rowwise().norm().cwiseQuotient(precision.cwiseSqrt());
  const double typical = median({misfit.data(), misfit.data() + misfit.size()});
  if (typical > 0) misfit /= typical;
  return misfit;
}

}  // namespace

LeadDeletion delete_leads(const SourceOperator& inverse, const Eigen::MatrixXd& window_V) {
  const Eigen::Index leads = inverse.map.cols(), points = inverse.kernel.cols() / 3;
  if (window_V.rows() != leads || window_V.cols() == 0)
    throw InputError(
        fmt::format("Leaving leads out: the operator has {} leads, the window is {} x {}.", leads,
                    window_V.rows(), window_V.cols()));
  const double samples = static_cast<double>(window_V.cols());
  const Eigen::MatrixXd deleted = inverse.precision * window_V;  // (P d)_m
  const Eigen::VectorXd precision = inverse.precision.diagonal();
  const Eigen::MatrixXd courses = inverse.kernel.transpose() * (inverse.map * window_V);  // J
  const Eigen::MatrixXd leads_seen = inverse.kernel.transpose() * inverse.map;            // T B'e_m
  // J c' for every lead, c = (P d)_m / P_mm.
  const Eigen::MatrixXd weights = precision.cwiseInverse().asDiagonal() * deleted;
  const Eigen::MatrixXd mixed = courses * weights.transpose();
  const Eigen::VectorXd weight_power = weights.rowwise().squaredNorm();
  const bool standardised = inverse.method == "sloreta";

  LeadDeletion result;
  result.misfit = relative_misfit(deleted, precision);
  result.power.resize(points, leads);
  for (Eigen::Index l = 0; l < points; ++l) {
    const auto own = courses.middleRows<3>(3 * l);
    const Eigen::Matrix3d power = own * own.transpose();
    const double total = power.trace();
    for (Eigen::Index m = 0; m < leads; ++m) {
      // J_m J_m' = J J' - (J c')g' - g(J c')' + g g'|c|^2, g = T B'e_m.
      const Eigen::Vector3d g = leads_seen.block<3, 1>(3 * l, m), v = mixed.block<3, 1>(3 * l, m);
      double value = total - 2 * g.dot(v) + g.squaredNorm() * weight_power[m];
      if (standardised) {
        const double gg = g.squaredNorm(), room = precision[m] - gg;
        const double along = g.dot(power * g) - 2 * gg * g.dot(v) + gg * gg * weight_power[m];
        if (room > 1e-12 * precision[m]) value += along / room;
      }
      result.power(l, m) = std::max(value, 0.0) / samples;
    }
  }
  return result;
}

}  // namespace headwater
