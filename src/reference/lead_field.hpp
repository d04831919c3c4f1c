// SPDX-License-Identifier: GPL-3.0-or-later
// Plain twin of compute_gain: the series as printed, term by term, without the closed form split
// off.
#pragma once
#include <headwater/model/head.hpp>

#include <Eigen/Core>

namespace headwater::reference {

Eigen::MatrixXd compute_gain(const HeadModel& head, const Eigen::Matrix3Xd& electrodes,
                             const Eigen::Matrix3Xd& points_m);

}  // namespace headwater::reference
