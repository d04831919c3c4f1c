// SPDX-License-Identifier: GPL-3.0-or-later
// What minimum norm, sLORETA and eLORETA share: the estimator J = R K'(K R K' + lambda C)^-1 y,
// from one eigendecomposition. In coordinates whitened by C: G = (WK) R (WK)' = U diag(d) U', z =
// U'W y, and with alpha = lambda times the contrast's noise scale
//   J = R (WK)' U diag(1/(d+alpha)) z,   residual of the whitened data = U diag(alpha/(d+alpha)) z.
#pragma once
#include <headwater/inverse/subspace.hpp>

#include <Eigen/Core>

namespace headwater {

struct GramSpectrum {
  Eigen::VectorXd values;   ///< d, ascending, #dimension
  Eigen::MatrixXd vectors;  ///< U
};

/// Of X X', X = WK R^(1/2) (M-1 by 3N).
GramSpectrum gram_spectrum(const Eigen::MatrixXd& weighted_gain);

/// z-map U'W B' (M-1 by M): from data (V, any reference) to the coordinates of the spectrum.
Eigen::MatrixXd spectrum_map(const Subspace& subspace, const GramSpectrum& spectrum);

/// How well an estimate explains the contrast in a window.
struct FitQuality {
  double explained_variance =
      0;                      ///< 1 - |y - K J|^2 / |y|^2, plain sensor space (average reference)
  double residual_noise = 0;  ///< rms of the whitened residual: 1 is the noise alone
  double snr = 0;             ///< rms of the whitened contrast: 1 is noise alone
};

/// z: spectrum coordinates of the window's samples. alpha: lambda * noise_scale.
FitQuality ridge_fit(const Subspace& subspace, const GramSpectrum& spectrum,
                     const Eigen::MatrixXd& z, double alpha, double noise_scale);

}  // namespace headwater
