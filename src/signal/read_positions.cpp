// SPDX-License-Identifier: GPL-3.0-or-later
// Electrode positions that are in the head frame or in MNI space already. A cap in a frame of its
// own: read_cap.cpp.
#include "position_table.hpp"

#include <headwater/base/error.hpp>
#include <headwater/base/head_frame.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/electrodes.hpp>

#include <fmt/core.h>

#include <utility>

namespace headwater {
namespace {

namespace fs = std::filesystem;

// Between the heads of newborns and anything that could be meant.
bool makes_a_head(double radius_m) {
  return radius_m >= 40e-3 && radius_m <= 200e-3;
}

/// Throws when a sphere through the positions could be no head in the stated unit.
void check_unit(const Eigen::Matrix3Xd& raw, const LengthUnit& unit, const std::string& source) {
  double radius = 0;
  try {
    radius = fit_sphere(raw).radius;
  } catch (const InputError& error) {
    throw InputError(fmt::format("{}: no sphere through the positions: {}", source, error.what()));
  }
  if (makes_a_head(radius * unit.metres)) return;
  std::string advice = "no unit (mm, cm, m) would make a head of them";
  for (const LengthUnit& other : kLengthUnits)
    if (makes_a_head(radius * other.metres))
      advice = fmt::format("in {} they would make a head of {:.0f} mm", other.name,
                           radius * other.metres / kMillimetre);
  throw InputError(
      fmt::format("{}: read in {}, the positions lie on a sphere of radius {:.4g} mm, expected 40 "
                  "to 200 mm; {}.",
                  source, unit.name, radius * unit.metres / kMillimetre, advice));
}

}  // namespace

Montage read_positions(const fs::path& path, PositionSpace space) {
  PositionTable table = read_position_table(path);
  Montage montage = std::move(table.rows);
  check_unit(montage.positions, table.unit, table.source);
  montage.positions *= table.unit.metres;
  if (space == PositionSpace::mni) montage.positions.colwise() -= kHeadCentreMni;
  return montage;
}

}  // namespace headwater
