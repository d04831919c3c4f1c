// SPDX-License-Identifier: GPL-3.0-or-later
// Tables of electrode positions as they stand, in their own unit and axes: what read_positions and
// read_cap share.
#pragma once
#include <headwater/base/json.hpp>
#include <headwater/signal/electrodes.hpp>

#include <array>
#include <filesystem>
#include <optional>
#include <string>
#include <string_view>

namespace headwater {

struct LengthUnit {
  std::string_view name;
  double metres;
};
inline constexpr std::array<LengthUnit, 3> kLengthUnits{{{"mm", 1e-3}, {"cm", 1e-2}, {"m", 1}}};

/// The unit that a value of a side file names, if it names one.
std::optional<LengthUnit> length_unit(const Json& value);

struct PositionTable {
  std::string source;
  Montage rows;  ///< in `unit`, rows without a position left out
  Labels without_position;
  LengthUnit unit = kLengthUnits[0];
  std::filesystem::path side_path;  ///< coordsystem.json, empty for columns with the unit in them
  Json side;
};

/// Errors (InputError): no such columns, unit not stated, repeated names, fewer than 4 positions.
PositionTable read_position_table(const std::filesystem::path& path);

}  // namespace headwater
