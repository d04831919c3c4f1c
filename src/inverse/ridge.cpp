// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/inverse/ridge.hpp>

#include <Eigen/Eigenvalues>

#include <cmath>

namespace headwater {

GramSpectrum gram_spectrum(const Eigen::MatrixXd& weighted_gain) {
  Eigen::MatrixXd gram = Eigen::MatrixXd::Zero(weighted_gain.rows(), weighted_gain.rows());
  gram.selfadjointView<Eigen::Lower>().rankUpdate(weighted_gain);
  const Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd> solver(gram);
  return {solver.eigenvalues().cwiseMax(0), solver.eigenvectors()};
}

Eigen::MatrixXd spectrum_map(const Subspace& subspace, const GramSpectrum& spectrum) {
  return spectrum.vectors.transpose() * subspace.whitener * subspace.basis.transpose();
}

FitQuality ridge_fit(const Subspace& subspace, const GramSpectrum& spectrum,
                     const Eigen::MatrixXd& z, double alpha, double scale) {
  const Eigen::ArrayXd shrink = alpha / (spectrum.values.array() + alpha);
  const Eigen::MatrixXd residual = shrink.matrix().asDiagonal() * z;
  // Back to volts: y = F U z with F = W^-1.
  const auto to_volts = [&](const Eigen::MatrixXd& whitened) -> Eigen::MatrixXd {
    return subspace.whitener.triangularView<Eigen::Lower>().solve(spectrum.vectors * whitened);
  };
  const double total = to_volts(z).squaredNorm(), size = static_cast<double>(z.size());
  FitQuality fit;
  fit.explained_variance = total > 0 ? 1 - to_volts(residual).squaredNorm() / total : 0;
  fit.residual_noise = std::sqrt(residual.squaredNorm() / (size * scale));
  fit.snr = std::sqrt(z.squaredNorm() / (size * scale));
  return fit;
}

}  // namespace headwater
