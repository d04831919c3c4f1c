// SPDX-License-Identifier: GPL-3.0-or-later
// The lead field of current dipoles in concentric shells: the potential at electrodes on the outer
// sphere for a unit dipole along x, y and z at each point.
//
//   V = 1/(4 pi sigma_K R^2) sum_{n>=1} (2n+1)/n b^(n-1) f_n [ n q_r P_n(x) + q_t cos(beta)
//   P_n^1(x) ],
// b = r0/R, x = cosine between point and electrode, P_n^1 = sin P_n' >= 0 near x = 1. As a vector,
// with u and e the unit directions of point and electrode:
//   L(e, point) = k [ (A - x T) u + T e ],  k = 1/(4 pi sigma_K R^2),
//   A = sum (2n+1) b^(n-1) f_n P_n(x),  T = sum (2n+1)/n b^(n-1) f_n P_n'(x).
// The homogeneous sphere's closed form (Frank 1952 J Appl Phys 23:1225) times the limit of f_n is
// split off and only the rest summed (de Munck & Peters 1993).
//
// Shapes: M x 3N, source-major columns (s0 x, s0 y, s0 z, s1 x, ...). Unit: V/(A m).
// Accuracy: 1e-9 of the surface maximum of each dipole for points up to 0.99 of the innermost
// shell's radius (number of terms from a bound on the tail, never from the size of a term, which
// symmetry can make zero); beyond 0.99 the same bound with more terms. The potential has zero mean
// over the outer sphere.
#pragma once
#include <headwater/base/labels.hpp>
#include <headwater/model/head.hpp>

#include <Eigen/Core>

namespace headwater {

struct LeadField {
  Labels channels;
  Eigen::MatrixXd gain;  ///< M by 3N, V/(A m), zero mean over the outer sphere (no reference)
};

/// electrodes: 3 by M, head frame, any length (used as directions); points_m: 3 by N, head frame,
/// m. Throws InputError: an electrode at the origin, a point at or outside the innermost shell
/// (says which, its eccentricity, and the shell's radius), non-finite coordinates.
Eigen::MatrixXd compute_gain(const HeadModel& head,
                             const Eigen::Ref<const Eigen::Matrix3Xd>& electrodes,
                             const Eigen::Ref<const Eigen::Matrix3Xd>& points_m);

}  // namespace headwater
