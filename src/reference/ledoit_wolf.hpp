// SPDX-License-Identifier: GPL-3.0-or-later
// Plain twin of ledoit_wolf_weight, for tests.
#pragma once
#include <Eigen/Core>

namespace headwater::reference {

/// Weight of the identity by Ledoit & Wolf 2004, J Multivar Anal 88:365, term by term: independent
/// samples of zero mean, p by n, S = X X'/n.
double ledoit_wolf_weight(const Eigen::MatrixXd& samples);

}  // namespace headwater::reference
