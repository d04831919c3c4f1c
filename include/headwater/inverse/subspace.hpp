// SPDX-License-Identifier: GPL-3.0-or-later
// Where every inverse works: lead field, data and noise in the subspace orthogonal to the reference
// (signal/reference.hpp), K = B'L, y = B'd, C = the noise covariance there, all of full rank M-1.
//
//   whitener W, lower triangular, W C W' = I (C = F F', W = F^-1)
//   whitened_gain = W K
// C is the covariance of one contrast, or of a single trial: contrasts of one participant differ by
// a factor only, so that one Subspace serves them all (`noise_scale`).
#pragma once
#include <headwater/base/labels.hpp>
#include <headwater/signal/contrast.hpp>

#include <Eigen/Core>

#include <string>

namespace headwater {

struct Subspace {
  Labels channels;
  Eigen::MatrixXd basis;          ///< B, M by M-1
  Eigen::MatrixXd gain;           ///< K, M-1 by 3N, V/(A m)
  Eigen::MatrixXd noise_V2;       ///< C, M-1 by M-1
  Eigen::MatrixXd whitener;       ///< W, M-1 by M-1
  Eigen::MatrixXd whitened_gain;  ///< W K

  Eigen::Index dimension() const { return gain.rows(); }
  Eigen::Index points() const { return gain.cols() / 3; }
};

/// gain: M by 3N against any reference, channels in the order of its rows. noise_V2: M-1 by M-1 in
/// the same basis. Throws InputError when sizes disagree (all sizes printed) or C is not positive
/// definite.
Subspace make_subspace(const Labels& channels, const Eigen::MatrixXd& gain,
                       const Eigen::MatrixXd& noise_V2);

/// Factor s with contrast noise = s C, when the contrast's covariance is proportional to the
/// subspace's (1e-9 of its largest entry); 0 otherwise.
double noise_scale(const Subspace& subspace, const Eigen::MatrixXd& contrast_noise_V2);

/// A linear estimator of source moments. J (3N by T) = kernel' (map d), d the data (M by T, V, any
/// reference). The kernel is kept transposed so that the three columns of a point are contiguous.
struct SourceOperator {
  std::string method;      ///< "minimum-norm", "sloreta", "eloreta", "lcmv"
  std::string quantity;    ///< "amplitude", "standardised amplitude", ...
  std::string unit;        ///< of file values: "nA m" or "" (multiples of the noise)
  double unit_in_SI = 1;   ///< value in file = value inside / unit_in_SI
  Eigen::MatrixXd kernel;  ///< M-1 by 3N
  Eigen::MatrixXd map;     ///< M-1 by M
  bool pair_blind =
      false;          ///< suppresses correlated bilateral sources (LCMV without mirror pairing)
  double lambda = 0;  ///< multiplier of the contrast's noise covariance; NaN where none
  /// B A^-1 B', M by M: A the data covariance that the estimate rests on (K R K' + lambda C; LCMV:
  /// D). What leaving a lead out needs (influence.hpp).
  Eigen::MatrixXd precision;
};

}  // namespace headwater
