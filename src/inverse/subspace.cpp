// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/error.hpp>
#include <headwater/inverse/subspace.hpp>
#include <headwater/signal/reference.hpp>

#include <Eigen/Cholesky>
#include <fmt/core.h>

namespace headwater {

Subspace make_subspace(const Labels& channels, const Eigen::MatrixXd& gain,
                       const Eigen::MatrixXd& noise_V2) {
  const auto count = static_cast<Eigen::Index>(channels.size());
  if (gain.rows() != count || gain.cols() % 3 != 0 || noise_V2.rows() != count - 1 ||
      noise_V2.cols() != count - 1)
    throw InputError(
        fmt::format("Sizes disagree: {} channels, lead field {} x {}, noise covariance "
                    "{} x {} (expected {} rows, a multiple of 3 columns; {} x {}).",
                    count, gain.rows(), gain.cols(), noise_V2.rows(), noise_V2.cols(), count,
                    count - 1, count - 1));
  Subspace subspace;
  subspace.channels = channels;
  subspace.basis = reference_free_basis(count);
  subspace.gain.noalias() = subspace.basis.transpose() * gain;
  subspace.noise_V2 = noise_V2;
  if (!gain.allFinite()) throw InputError("The lead field holds a value that is not a number.");
  const Eigen::LLT<Eigen::MatrixXd> factor(noise_V2);
  // A matrix of lower rank may be factorised all the same, by rounding; NaN passes every
  // comparison.
  if (!noise_V2.allFinite() || factor.info() != Eigen::Success || factor.rcond() < 1e-14)
    throw InputError(
        "The noise covariance is not positive definite: shrink it (noise.shrinkage above "
        "0), or give more samples.");
  subspace.whitener = Eigen::MatrixXd::Identity(count - 1, count - 1);
  factor.matrixL().solveInPlace(subspace.whitener);
  subspace.whitened_gain = subspace.gain;
  factor.matrixL().solveInPlace(subspace.whitened_gain);
  return subspace;
}

double noise_scale(const Subspace& subspace, const Eigen::MatrixXd& contrast_noise_V2) {
  const auto& base = subspace.noise_V2;
  if (base.rows() != contrast_noise_V2.rows() || base.cols() != contrast_noise_V2.cols()) return 0;
  const double scale = contrast_noise_V2.trace() / base.trace();
  const double deviation = (contrast_noise_V2 - scale * base).cwiseAbs().maxCoeff();
  return deviation <= 1e-9 * contrast_noise_V2.cwiseAbs().maxCoeff() ? scale : 0;
}

}  // namespace headwater
