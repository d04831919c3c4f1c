// SPDX-License-Identifier: GPL-3.0-or-later
// Electrode directions of the 10-20, 10-10 and 10-5 systems by rule, on a sphere.
//
// Rule: Fpz, T7, T8 and Oz lie on the equator; each 10 % is 22.5 degrees along the midline and the
// central coronal line, 18 degrees along the equatorial ring. Sites of an inner row (AFp to POO)
// lie on the circle through the row's ring site, its midline site and the opposite ring site, cut
// into equal arcs: 12.5 % a step (1h, 1, 3h, 3, ... 7h, ring). Below the ring, 9h and 9 (and N, I
// rows) lie 11.25 and 22.5 degrees lower at the ring site's azimuth. The cap is then pitched by
// -4.4 degrees about x (Fpz goes down).
//
// Frame: head frame (RAS axes through the centre of the fitted sphere). Unit vectors, no unit.
// Accuracy: against sites measured on the template head mean 2.2, at most 4.8 degrees.
// Source: Oostenveld & Praamstra 2001 Clin Neurophysiol 112:713 (names); pitch and angles fitted to
// measured sites, see templates/README.md.
#pragma once
#include <headwater/base/labels.hpp>

#include <Eigen/Core>

#include <optional>
#include <string>
#include <string_view>

namespace headwater {

/// Unit vector of a site; upper and lower case alike; T3, T4, T5, T6 are T7, T8, P7, P8. Empty for
/// a name outside the systems (mastoids and ear lobes have no 10-5 name).
std::optional<Eigen::Vector3d> standard_direction(std::string_view name);

/// The customary spelling ("FCZ" -> "FCz", "T3" -> "T7"), empty for an unknown name.
std::string standard_name(std::string_view name);

/// Every name of the 10-5 system in customary spelling, front to back, left to right.
const Labels& standard_names();

}  // namespace headwater
