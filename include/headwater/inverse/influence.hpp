// SPDX-License-Identifier: GPL-3.0-or-later
// How far an answer moves when one lead is left out.
//
// Leaving lead m out restricts the reference-free subspace to the complement of u = B'e_m (which is
// orthogonal there to the reference of the leads that stay). With A = K R K' + lambda C (R the
// source weights) the restricted inverse is a rank-one downdate,
//   (P A P')^-1 in the complement = A^-1 - a a'/(u'a),  a = A^-1 u
// so that with g = R K'a / (u'a) and c(t) = a'y(t) every estimate without the lead is
//   J_m(t) = J(t) - g c(t),
// and sLORETA's blocks S_ll, m = S_ll - (K_l'a)(K_l'a)'/(u'a). What is needed of J is its power
// over a window, J_l J_l' (3 x 3 of each point), which is updated in the same way: all leads cost
// about one product with the kernel. lambda and the source weights stay as they were with all leads
// (eLORETA's are not iterated anew); LCMV's filters are remade from the downdated data covariance,
// with the direction of each point kept.
#pragma once
#include <headwater/inverse/dipole_scan.hpp>
#include <headwater/inverse/subspace.hpp>

#include <Eigen/Core>

#include <vector>

namespace headwater {

/// Mean over the window's samples of the squared amplitude of each point, lead m left out: N by M.
/// Of an operator made of `subspace` (its own map, scale and kind); y_V: M by T_w, the window.
Eigen::MatrixXd power_without_leads(const Subspace& subspace, const SourceOperator& inverse,
                                    const Eigen::MatrixXd& window_V);

}  // namespace headwater
