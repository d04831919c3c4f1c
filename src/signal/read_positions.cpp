// SPDX-License-Identifier: GPL-3.0-or-later
// Tables of electrode positions: our own with the unit in the column names, or those of BIDS
// (electrodes.tsv), whose unit stands in the coordsystem.json beside them.
#include <headwater/base/error.hpp>
#include <headwater/base/head_frame.hpp>
#include <headwater/base/json.hpp>
#include <headwater/base/table.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/electrodes.hpp>

#include <fmt/core.h>

#include <array>
#include <cmath>

namespace headwater {
namespace {

namespace fs = std::filesystem;

struct LengthUnit {
  std::string_view name;
  double metres;
};
constexpr std::array<LengthUnit, 3> kLengthUnits{{{"mm", 1e-3}, {"cm", 1e-2}, {"m", 1}}};

// Between the heads of newborns and anything that could be meant.
bool makes_a_head(double radius_m) {
  return radius_m >= 40e-3 && radius_m <= 200e-3;
}

/// The file that states the unit of a BIDS electrodes.tsv, or an empty path.
fs::path coordinate_file(const fs::path& table) {
  static constexpr std::string_view ending = "electrodes.tsv";
  std::string name = table.filename().string();
  if (const auto at = name.rfind(ending); at != std::string::npos) {
    name.replace(at, ending.size(), "coordsystem.json");
    if (fs::path beside = table.parent_path() / name; fs::exists(beside)) return beside;
  }
  const fs::path plain = table.parent_path() / "coordsystem.json";
  return fs::exists(plain) ? plain : fs::path();
}

LengthUnit stated_unit(const fs::path& table) {
  const std::string way_out = "State it there (mm, cm or m), or name the columns x_mm, y_mm, z_mm.";
  const fs::path path = coordinate_file(table);
  if (path.empty())
    throw InputError(fmt::format(
        "{}: the unit of x, y, z is not stated: no coordsystem.json with EEGCoordinateUnits beside "
        "the table. {}",
        table.string(), way_out));
  const Json json = read_json(path, "coordinate system of the electrodes");
  const Json* unit = json.is_object() ? json.find("EEGCoordinateUnits") : nullptr;
  if (!unit)
    throw InputError(fmt::format("{}: no EEGCoordinateUnits, so the unit of {} is not stated. {}",
                                 path.string(), table.filename().string(), way_out));
  std::string found = unit->dump();
  for (const LengthUnit& known : kLengthUnits)
    if (found == fmt::format("\"{}\"", known.name)) return known;
  throw InputError(fmt::format("{}: EEGCoordinateUnits is {}, expected \"mm\", \"cm\" or \"m\". {}",
                               path.string(), found, way_out));
}

/// Names and positions in the table's own unit, rows without a position left out.
Montage position_rows(const Table& table, const std::array<std::size_t, 3>& axes) {
  const std::size_t name = table.column("name");
  Montage montage;
  std::vector<Eigen::Vector3d> positions;
  for (std::size_t row = 0; row < table.rows.size(); ++row) {
    const auto x = table.optional_number(row, axes[0]), y = table.optional_number(row, axes[1]),
               z = table.optional_number(row, axes[2]);
    if (!x || !y || !z) continue;
    montage.labels.push_back(table.rows[row][name]);
    positions.emplace_back(*x, *y, *z);
  }
  montage.positions.resize(3, static_cast<Eigen::Index>(positions.size()));
  for (std::size_t i = 0; i < positions.size(); ++i)
    montage.positions.col(static_cast<Eigen::Index>(i)) = positions[i];
  if (const Labels repeated = repeated_labels(montage.labels); !repeated.empty())
    throw InputError(fmt::format("{}: more than one row is named {} (upper and lower case alike).",
                                 table.source, join_labels(repeated)));
  if (positions.size() < 4)
    throw InputError(
        fmt::format("{}: {} positions (rows with n/a left out), at least 4 are needed.",
                    table.source, positions.size()));
  return montage;
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
  const Table table = read_table(path, "table of electrode positions");
  const bool unit_in_names = table.find_column("x_mm").has_value();
  const LengthUnit unit = unit_in_names ? kLengthUnits[0] : [&] {
    if (!table.find_column("x"))
      throw InputError(fmt::format(
          "{}: expected the columns name, x_mm, y_mm, z_mm (or name, x, y, z with the unit in a "
          "coordsystem.json), found {}.",
          table.source, join_labels(table.columns)));
    return stated_unit(path);
  }();
  Montage montage = position_rows(
      table, unit_in_names
                 ? std::array{table.column("x_mm"), table.column("y_mm"), table.column("z_mm")}
                 : std::array{table.column("x"), table.column("y"), table.column("z")});
  check_unit(montage.positions, unit, table.source);
  montage.positions *= unit.metres;
  if (space == PositionSpace::mni) montage.positions.colwise() -= kHeadCentreMni;
  return montage;
}

}  // namespace headwater
