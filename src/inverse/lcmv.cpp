// SPDX-License-Identifier: GPL-3.0-or-later
// In coordinates whitened by D = F F': X = F^-1 K, so that K'D^-1 K = X'X and W_l = (X_l'X_l)^-1
// X_l' F^-1; the noise of the data seen there is N = F^-1 C F^-T.
#include <headwater/base/error.hpp>
#include <headwater/base/units.hpp>
#include <headwater/inverse/lcmv.hpp>
#include <headwater/inverse/sloreta.hpp>
#include <headwater/signal/reference.hpp>

#include <Eigen/Cholesky>
#include <Eigen/Eigenvalues>
#include <fmt/core.h>

#include <cmath>
#include <limits>

namespace headwater {
namespace {

using Block = Eigen::Matrix<double, Eigen::Dynamic, 3>;

/// W_l' F (M-1 by 3): columns are the three filters, acting on F^-1 y.
Block unit_gain_filters(const Eigen::MatrixXd& x, Eigen::Index point, Eigen::Index partner) {
  const Block own = x.middleCols<3>(3 * point);
  if (partner < 0 || partner == point) return own * (own.transpose() * own).inverse();
  Eigen::Matrix<double, Eigen::Dynamic, 6> both(x.rows(), 6);
  both << own, x.middleCols<3>(3 * partner);
  const Eigen::Matrix<double, 6, 6> inverse = (both.transpose() * both).inverse();
  return both * inverse.leftCols<3>();
}

/// Direction of maximum power of the filters, pointing outwards. power and noise: 3 x 3 covariances
/// of the filters' output; by_noise: power relative to noise is maximised.
Eigen::Vector3d strongest_direction(const Eigen::Matrix3d& power, const Eigen::Matrix3d& noise,
                                    bool by_noise, const Eigen::Vector3d& outward) {
  Eigen::Vector3d direction;
  if (by_noise) {
    const Eigen::GeneralizedSelfAdjointEigenSolver<Eigen::Matrix3d> solver(power, noise);
    direction = solver.eigenvectors().col(2).normalized();
  } else {
    direction = Eigen::SelfAdjointEigenSolver<Eigen::Matrix3d>(power).eigenvectors().col(2);
  }
  return direction.dot(outward) < 0 ? Eigen::Vector3d(-direction) : direction;
}

/// One-direction filter as three parallel columns: J = direction * (filter' y).
Block along_direction(const Eigen::VectorXd& filter, const Eigen::Vector3d& direction) {
  return filter * direction.transpose();
}

}  // namespace

Eigen::MatrixXd pooled_data_covariance(const std::vector<Average>& averages, double from_s,
                                       double to_s) {
  if (averages.empty()) throw InputError("No average to take the data covariance from.");
  const Eigen::MatrixXd basis = reference_free_basis(averages[0].data_V.rows());
  Eigen::MatrixXd covariance = Eigen::MatrixXd::Zero(basis.cols(), basis.cols());
  Eigen::Index samples = 0;
  for (const auto& average : averages)
    for (Eigen::Index t = 0; t < average.times_s.size(); ++t)
      if (average.times_s[t] >= from_s - 1e-9 && average.times_s[t] <= to_s + 1e-9) {
        const Eigen::VectorXd y = basis.transpose() * average.data_V.col(t);
        covariance += y * y.transpose();
        ++samples;
      }
  if (samples == 0)
    throw InputError(fmt::format("No sample between {:g} and {:g} ms for the LCMV data covariance.",
                                 from_s / kMillisecond, to_s / kMillisecond));
  return covariance / static_cast<double>(samples);
}

Lcmv::Lcmv(const Subspace& subspace, const Eigen::MatrixXd& data_covariance_V2,
           const Eigen::Matrix3Xd& outward, const std::vector<Eigen::Index>& mirror,
           const LcmvOptions& options)
    : options_(options) {
  const Eigen::Index dimension = subspace.dimension();
  Eigen::MatrixXd d = data_covariance_V2;
  d.diagonal().array() +=
      options.regularisation * data_covariance_V2.trace() / static_cast<double>(dimension);
  const Eigen::LLT<Eigen::MatrixXd> factor(d);
  if (factor.info() != Eigen::Success || factor.rcond() < 1e-14)
    throw InputError(
        fmt::format("The LCMV data covariance ({} x {}) is singular: raise "
                    "lcmv.regularisation (now {:g}).",
                    dimension, dimension, options.regularisation));
  map_ = subspace.basis.transpose();
  factor.matrixL().solveInPlace(map_);
  Eigen::MatrixXd x = subspace.gain;
  factor.matrixL().solveInPlace(x);
  Eigen::MatrixXd noise_root = subspace.whitener.triangularView<Eigen::Lower>().solve(
      Eigen::MatrixXd::Identity(dimension, dimension));
  factor.matrixL().solveInPlace(noise_root);
  const Eigen::MatrixXd noise = noise_root * noise_root.transpose();  // N
  Eigen::MatrixXd noise_x;
  if (!options.mirror_paired) noise_x.noalias() = noise * x;

  kernel_.resize(dimension, x.cols());
  const bool by_noise = options.output != LcmvOptions::Output::unit_gain;
  for (Eigen::Index l = 0; l < subspace.points(); ++l) {
    const Block own = x.middleCols<3>(3 * l);
    const Eigen::Index partner =
        options.mirror_paired ? mirror[static_cast<std::size_t>(l)] : Eigen::Index{-1};
    Block filters = unit_gain_filters(x, l, partner);
    Eigen::Matrix3d output_noise = filters.transpose() * (noise * filters);
    if (options.orientation == LcmvOptions::Orientation::maximum_power) {
      const Eigen::Vector3d up = outward.col(l);
      if (options.mirror_paired) {
        const Eigen::Vector3d direction =
            strongest_direction(filters.transpose() * filters, output_noise, by_noise, up);
        const Eigen::VectorXd filter = filters * direction;
        filters = along_direction(filter, direction);
        output_noise = direction * filter.dot(noise * filter) * direction.transpose();
      } else {
        // Power relative to noise of the filter for direction q: q'X'X q / q'X'N X q; of unit gain
        // 1 / q'X'X q: the smallest eigenvalue, so the largest of the inverse.
        const Eigen::Matrix3d gram = own.transpose() * own;
        const Eigen::Matrix3d gram_noise = own.transpose() * noise_x.middleCols<3>(3 * l);
        const Eigen::Vector3d direction =
            by_noise ? strongest_direction(gram, gram_noise, true, up)
                     : strongest_direction(gram.inverse(), output_noise, false, up);
        const Eigen::VectorXd filter = own * direction / direction.dot(gram * direction);
        filters = along_direction(filter, direction);
        output_noise = direction * filter.dot(noise * filter) * direction.transpose();
      }
    }
    if (options.output == LcmvOptions::Output::unit_noise_gain)
      filters = filters * inverse_root(output_noise);
    if (options.output == LcmvOptions::Output::activity_index) {
      const auto white = subspace.whitened_gain.middleCols<3>(3 * l);
      filters /= std::sqrt((white.transpose() * white).inverse().trace());
    }
    kernel_.middleCols<3>(3 * l) = filters;
  }
}

SourceOperator Lcmv::at(double noise_scale) const {
  SourceOperator result;
  result.method = "lcmv";
  result.map = map_;
  result.kernel = kernel_;
  result.precision.noalias() = map_.transpose() * map_;
  result.pair_blind = !options_.mirror_paired;
  result.lambda = std::numeric_limits<double>::quiet_NaN();
  if (options_.output == LcmvOptions::Output::unit_gain) {
    result.quantity = "amplitude";
    result.unit = "nA m";
    result.unit_in_SI = kNanoampereMetre;
  } else {
    result.quantity = options_.output == LcmvOptions::Output::unit_noise_gain
                          ? "amplitude in noise units"
                          : "root of the activity index";
    result.kernel /= std::sqrt(noise_scale);
  }
  return result;
}

}  // namespace headwater
