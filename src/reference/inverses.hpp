// SPDX-License-Identifier: GPL-3.0-or-later
// Plain twins of the inverses: the formulas as printed, with dense inverses of the matrices as they
// stand, without whitening, eigendecompositions or factors kept. All work in the reference-free
// subspace: K (m by 3N, V/(A m)), C (m by m, V^2, the contrast's own), and return the operator (3N
// by m) on y.
#pragma once
#include <Eigen/Core>

#include <vector>

namespace headwater::reference {

/// R K'(K R K' + lambda C)^-1, R = blockdiag(||K_l||_F^(-2p) I).
Eigen::MatrixXd minimum_norm(const Eigen::MatrixXd& k, const Eigen::MatrixXd& c, double lambda,
                             double depth_exponent);

/// S_ll^(-1/2) T_l, T = K'(K K' + lambda C)^-1, S = T K.
Eigen::MatrixXd sloreta(const Eigen::MatrixXd& k, const Eigen::MatrixXd& c, double lambda);

/// W_l^-1 K_l'(K W^-1 K' + lambda C)^-1 after `iterations` rounds from W = I.
Eigen::MatrixXd eloreta(const Eigen::MatrixXd& k, const Eigen::MatrixXd& c, double lambda,
                        int iterations);

/// (K_l' D^-1 K_l)^-1 K_l' D^-1 for every point; with `mirror`, the first three rows of the same
/// formula for [K_l K_mirror(l)].
Eigen::MatrixXd lcmv_unit_gain(const Eigen::MatrixXd& k, const Eigen::MatrixXd& d,
                               const std::vector<Eigen::Index>* mirror);

/// Filter of unit gain for one direction q of point l: q'K_l'D^-1 / (q'K_l'D^-1 K_l q), 1 by m.
Eigen::RowVectorXd lcmv_along(const Eigen::MatrixXd& k, const Eigen::MatrixXd& d,
                              Eigen::Index point, const Eigen::Vector3d& direction);

}  // namespace headwater::reference
