// SPDX-License-Identifier: GPL-3.0-or-later
// The spherical head: concentric shells, and the frame in which they stand.
#pragma once
#include <headwater/base/head_frame.hpp>

#include <Eigen/Core>

namespace headwater {

/// K >= 1 concentric shells from inside to outside; the last radius is the scalp.
struct HeadModel {
  Eigen::VectorXd radii_m;
  Eigen::VectorXd conductivity_S_per_m;
};

/// Brain, skull, scalp at 0.87 : 0.92 : 1 of radius 92 mm; 0.33, 0.0132, 0.33 S/m (skull ratio
/// 1:25).
HeadModel default_head();

/// Throws ExperimentError: no shell, unequal lengths, radii not increasing or not positive,
/// conductivities not positive or not finite, a scalp radius outside 30 to 200 mm.
void check_head(const HeadModel& head);

}  // namespace headwater
