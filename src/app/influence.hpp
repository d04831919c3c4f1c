// SPDX-License-Identifier: GPL-3.0-or-later
// How far the answer of a window moves when one lead, one block of trials or one participant is
// left out, and who is named for it.
#pragma once
#include <headwater/app/located.hpp>

#include <vector>

namespace headwater {

/// Of a distributed estimate. window: its place among the contrast's windows (the parts' order).
WindowInfluence influence_on_map(const ForwardModel& forward, const SourceOperator& inverse,
                                 const Eigen::MatrixXd& window_V,
                                 const std::vector<PartLeftOut>& parts, std::size_t window);

/// Of the dipole scan's verdict about the window's mean map.
WindowInfluence influence_on_dipoles(const ForwardModel& forward, const DipoleScan& scan,
                                     const Eigen::MatrixXd& window_V,
                                     const std::vector<PartLeftOut>& parts, std::size_t window);

}  // namespace headwater
