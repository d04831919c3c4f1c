// SPDX-License-Identifier: GPL-3.0-or-later
// Shell factors f_n of the potential of a dipole in concentric shells (Zhang 1995 Phys Med Biol
// 40:335; de Munck & Peters 1993 IEEE TBME 40:1166; Sun 1997 IEEE TBME 44:1243).
//
// In shell k the potential of degree n is a_k r^n + b_k r^-(n+1). With t = a r^(2n+1) / b at an
// interface (r the interface's radius, s = sigma_outer / sigma_inner), continuity of potential and
// of normal current give
//   b_in / b_out = [ n(1-s) t + n + (n+1) s ] / (2n+1)
//   t_in         = [ (n+1 + n s) t + (n+1)(1-s) ] / [ n(1-s) t + n + (n+1) s ]
// and t shrinks by (r_in/r_out)^(2n+1) on the way inwards through a shell. No current leaves the
// scalp: t = (n+1)/n there. Then f_n = sigma_K/sigma_1 * prod b_out/b_in: nothing overflows for any
// n. Equal conductivities give f_n = 1 exactly.
#pragma once
#include <headwater/model/head.hpp>

#include <Eigen/Core>

namespace headwater {

/// f_1 ... f_N (index 0 holds f_1), dimensionless. Relative accuracy: a few times K eps.
Eigen::VectorXd shell_factors(const HeadModel& head, Eigen::Index terms);

/// Limit of f_n for n -> infinity: sigma_K/sigma_1 * prod 2 / (1 + s_k).
double shell_factor_limit(const HeadModel& head);

}  // namespace headwater
