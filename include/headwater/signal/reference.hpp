// SPDX-License-Identifier: GPL-3.0-or-later
// The reference: the one place that subtracts it. A reference is a linear map H on channels (M by
// M) that turns potentials against any reference into potentials against this one; H 1 = 0.
//   average        H = I - 1 1'/M
//   channel r      H = I - 1 e_r'
//   mean of a set  H = I - 1 w', w = 1/|set| on the set (linked mastoids)
// Inverses work in the subspace orthogonal to the constant vector, where every reference is the
// same: y = B' d with B (M by M-1), B'B = I, B'1 = 0.
#pragma once
#include <headwater/base/labels.hpp>

#include <Eigen/Core>

namespace headwater {

Eigen::MatrixXd average_reference(Eigen::Index channels);

/// Mean of the named channels (one or more, case ignored) of `labels`. Throws InputError listing
/// names that are not there.
Eigen::MatrixXd channel_reference(const Labels& labels, const Labels& reference);

/// Orthonormal basis B of the complement of the constant vector, M by M-1 (Helmert's columns:
/// column k has 1/sqrt(k(k+1)) in its first k rows, then -k/sqrt(k(k+1))). M >= 2.
Eigen::MatrixXd reference_free_basis(Eigen::Index channels);

}  // namespace headwater
