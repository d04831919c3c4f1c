// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/error.hpp>
#include <headwater/base/units.hpp>
#include <headwater/model/head.hpp>

#include <fmt/core.h>

namespace headwater {

HeadModel default_head() {
  HeadModel head;
  head.radii_m = Eigen::Vector3d(0.87, 0.92, 1.0) * 92 * kMillimetre;
  head.conductivity_S_per_m = Eigen::Vector3d(0.33, 0.0132, 0.33);
  return head;
}

void check_head(const HeadModel& head) {
  const auto shells = head.radii_m.size();
  if (shells == 0) throw ExperimentError("The head has no shell: give at least one radius.");
  if (head.conductivity_S_per_m.size() != shells)
    throw ExperimentError(
        fmt::format("The head has {} radii but {} conductivities: give one of each "
                    "for every shell, from inside to outside.",
                    shells, head.conductivity_S_per_m.size()));
  for (Eigen::Index k = 0; k < shells; ++k) {
    const double radius = head.radii_m[k], inner = k > 0 ? head.radii_m[k - 1] : 0;
    if (!(radius > inner))
      throw ExperimentError(
          fmt::format("Shell {} has radius {:g} mm, not above {:g} mm: radii must "
                      "be positive and grow from inside to outside.",
                      k + 1, radius / kMillimetre, inner / kMillimetre));
    const double sigma = head.conductivity_S_per_m[k];
    if (!(sigma > 0) || !(sigma < 1e6))
      throw ExperimentError(
          fmt::format("Shell {} has conductivity {:g} S/m: expected a positive "
                      "number (tissue: 0.004 to 2).",
                      k + 1, sigma));
  }
  const double scalp = head.radii_m[shells - 1];
  if (!(scalp >= 0.03 && scalp <= 0.2))
    throw ExperimentError(
        fmt::format("The outermost shell has radius {:g} mm: a head has 30 to 200 mm "
                    "(are the numbers in mm?).",
                    scalp / kMillimetre));
}

}  // namespace headwater
