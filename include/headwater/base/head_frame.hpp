// SPDX-License-Identifier: GPL-3.0-or-later
// Head frame: RAS axes (+x right, +y anterior, +z superior), metres, origin C = (0, -15.4, -2.8) mm
// in MNI space, the centre about which the standard electrode directions fit the template scalp
// best (templates/README.md).
#pragma once
#include <Eigen/Core>

namespace headwater {

/// MNI coordinates (m) of the origin of the head frame.
inline const Eigen::Vector3d kHeadCentreMni{0.0, -15.4e-3, -2.8e-3};

}  // namespace headwater
