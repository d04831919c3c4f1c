// SPDX-License-Identifier: GPL-3.0-or-later
// How far an answer moves when one lead, or one part of the data, is left out.
//
// Leaving lead m out restricts the reference-free subspace to the complement of u = B'e_m. With A =
// K R K' + lambda C (R the source weights) the restricted inverse is a rank-one downdate, A^-1 - a
// a'/(u'a), a = A^-1 u, and so the estimate without the lead is the same operator applied to
//   d_m(t) = d(t) - e_m (P d(t))_m / P_mm,   P = B A^-1 B'
// - the lead's value replaced by what the others predict of it. (P d)_m / P_mm is the deleted
// residual; divided by its model deviation P_mm^(-1/2) it compares leads. Of the window only J_l
// J_l' (3 x 3 of each point) is needed, which is updated in the same way: all leads together cost
// about one product with the kernel. sLORETA's standardisation is downdated too: with s =
// S_l^(-1/2) K_l'a,
//   power_m = |J_m|^2 + (s'J_m)^2 / (P_mm - |s|^2).
// So minimum norm (weights R kept) and sLORETA are exactly what the leads that stay give; eLORETA
// keeps its weights, LCMV the direction and noise gain of each point, all of them lambda.
#pragma once
#include <headwater/inverse/subspace.hpp>

#include <Eigen/Core>

namespace headwater {

struct LeadDeletion {
  /// Mean over the window's samples of the squared amplitude, N by M: column m without lead m.
  Eigen::MatrixXd power;
  /// rms over the window of each lead's deleted residual in model deviations, divided by the median
  /// over leads: how much worse than the others it is predicted by them.
  Eigen::VectorXd misfit;
};

/// window_V: M by T_w samples of the contrast, channels in the operator's order, any reference.
LeadDeletion delete_leads(const SourceOperator& inverse, const Eigen::MatrixXd& window_V);

}  // namespace headwater
