// SPDX-License-Identifier: GPL-3.0-or-later
// LCMV (Van Veen et al. 1997 IEEE TBME 44:867): filters of unit gain at a point that pass as little
// of the data as they can,
//   W_l = (K_l' D^-1 K_l)^-1 K_l' D^-1,  D = Cd + eps tr(Cd)/(M-1) I,  W_l K_l = I,
// with Cd the covariance of the data of all conditions pooled, about zero. Outputs of a contrast:
//   unit gain        J_l = W_l y, A m
//   unit noise gain  (W_l C W_l')^(-1/2) W_l y: length in multiples of the contrast's noise
//   activity index   J_l / tr([K_l' C^-1 K_l]^-1)^(1/2): the root of Van Veen's index, sample by
//   sample
// Maximum-power orientation (Sekihara & Nagarajan 2008): one direction for each point, that of
// largest power (unit gain: smallest eigenvalue of K_l' D^-1 K_l; else largest of (K_l' D^-1 K_l,
// K_l' D^-1 C D^-1 K_l)), pointing outwards; the vector output then lies along it. Mirror pairing
// (Brookes et al. 2007 NeuroImage 34:1454; Dalal et al. 2006 IEEE TBME 53:1357): a point and its
// mirror image enter the constraint together, so that the filter of one has no gain at the other
// and correlated bilateral sources cannot cancel each other. On the midline the plain filter is
// used. The direction of maximum power is then taken from the paired filter's output.
#pragma once
#include <headwater/inverse/subspace.hpp>

#include <vector>

namespace headwater {

struct LcmvOptions {
  enum class Output { unit_gain, unit_noise_gain, activity_index } output = Output::unit_noise_gain;
  enum class Orientation { vector, maximum_power } orientation = Orientation::maximum_power;
  bool mirror_paired = false;
  double regularisation = 0.05;  ///< eps
};

/// Covariance about zero of averages in the subspace, pooled over conditions and the samples within
/// [from_s, to_s]: (M-1) by (M-1), V^2. Throws InputError without a sample.
Eigen::MatrixXd pooled_data_covariance(const std::vector<Average>& averages, double from_s,
                                       double to_s);

class Lcmv {
 public:
  /// outward: 3 by N, away from the head's centre; mirror: of the source grid (used when paired).
  /// Throws InputError when D is not positive definite.
  Lcmv(const Subspace& subspace, const Eigen::MatrixXd& data_covariance_V2,
       const Eigen::Matrix3Xd& outward, const std::vector<Eigen::Index>& mirror,
       const LcmvOptions& options);
  /// For a contrast whose noise is noise_scale times the subspace's.
  SourceOperator at(double noise_scale) const;

 private:
  LcmvOptions options_;
  Eigen::MatrixXd map_;     // F^-1 B', D = F F'
  Eigen::MatrixXd kernel_;  // for noise_scale 1
};

}  // namespace headwater
