// SPDX-License-Identifier: GPL-3.0-or-later
// The one eigenpair that is asked for, without the others: Lanczos iteration with restarts
// (Spectra), at the price of a few matrix-vector products.
#pragma once
#include <Eigen/Core>

namespace headwater {

struct Eigenpair {
  double value = 0;
  Eigen::VectorXd vector;  ///< length 1; the sign is that of the iteration, the same each time
};

/// Largest eigenvalue of a symmetric matrix (both triangles filled) and its vector, to 1e-10 of the
/// value. Small matrices, and those on which the iteration does not converge, are solved whole.
Eigenpair largest_eigenpair(const Eigen::MatrixXd& symmetric);

}  // namespace headwater
