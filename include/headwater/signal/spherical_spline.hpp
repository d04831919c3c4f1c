// SPDX-License-Identifier: GPL-3.0-or-later
// Interpolation of the potential on the sphere by spherical splines (Perrin et al. 1989,
// Electroenceph Clin Neurophysiol 72:184, with the corrigendum 76:565):
//   V(u) = c_0 + sum_i c_i g(u . e_i), sum_i c_i = 0,
//   g(x) = 1/(4 pi) sum_{n>=1} (2n+1) / (n (n+1))^4 P_n(x),
// through the measured values exactly. Of all surfaces through them it bends least.
#pragma once
#include <Eigen/Core>

#include <vector>

namespace headwater {

/// g(x) above, -1 <= x <= 1, to 1e-8 of g(1).
double spline_kernel(double x);

/// The linear map P (#to by #from) with V(to) = P V(from): rows sum to 1; P at an electrode is 1
/// there. Directions of any length > 0; those of `from` at least 4, no two alike (InputError).
Eigen::MatrixXd spline_interpolation(const Eigen::Matrix3Xd& from, const Eigen::Matrix3Xd& to);

/// Prediction of each electrode from all the others, all at once (M by M, zero diagonal): from the
/// inverse S of the bordered spline system, P_ij = -S_ij / S_ii.
Eigen::MatrixXd spline_prediction(const Eigen::Matrix3Xd& directions);

}  // namespace headwater
