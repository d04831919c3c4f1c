// SPDX-License-Identifier: GPL-3.0-or-later
// Our own tables have the unit in the column names; those of BIDS (electrodes.tsv) have it in a
// coordsystem.json: the one of the same name, else plain coordsystem.json, else - the inheritance
// principle - the nearest in the folders above, up to the data set's root, whose entities
// (sub-01, ses-2, space-...) are all among the table's.
#include "position_table.hpp"

#include <headwater/base/error.hpp>
#include <headwater/base/table.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <set>
#include <system_error>
#include <utility>
#include <vector>

namespace headwater {
namespace {

namespace fs = std::filesystem;

/// Entities of a BIDS file name "a-1_b-2_suffix", or nothing when it does not end in the suffix.
std::optional<std::set<std::string>> entities(std::string name, std::string_view suffix) {
  if (!name.ends_with(suffix)) return std::nullopt;
  name.resize(name.size() - suffix.size());
  if (!name.empty() && name.back() != '_') return std::nullopt;
  std::set<std::string> found;
  for (std::size_t from = 0; from < name.size();) {
    const std::size_t to = name.find('_', from);
    found.insert(name.substr(from, to - from));
    from = to + 1;
  }
  return found;
}

/// Folders in which a side file of the table may stand, nearest first.
std::vector<fs::path> bids_folders(const fs::path& table) {
  std::vector<fs::path> folders;
  fs::path folder = fs::absolute(table).lexically_normal().parent_path();
  while (true) {
    folders.push_back(folder);
    const std::string name = folder.filename().string();
    const bool inside = name == "eeg" || name == "ieeg" || name == "meg" ||
                        name.starts_with("sub-") || name.starts_with("ses-");
    if (!inside || fs::exists(folder / "dataset_description.json")) return folders;
    folder = folder.parent_path();
  }
}

fs::path inherited_coordinate_file(const fs::path& table,
                                   const std::set<std::string>& of_the_table) {
  for (const fs::path& folder : bids_folders(table)) {
    std::vector<std::pair<std::size_t, fs::path>> candidates;
    std::error_code unreadable;  // then nothing is inherited from there
    for (const auto& entry : fs::directory_iterator(folder, unreadable)) {
      const auto own = entities(entry.path().filename().string(), "coordsystem.json");
      if (own && std::includes(of_the_table.begin(), of_the_table.end(), own->begin(), own->end()))
        candidates.emplace_back(own->size(), entry.path());
    }
    if (!candidates.empty()) return std::max_element(candidates.begin(), candidates.end())->second;
  }
  return {};
}

/// The file that states the unit of a BIDS electrodes.tsv, or an empty path.
fs::path coordinate_file(const fs::path& table) {
  static constexpr std::string_view ending = "electrodes.tsv";
  std::string name = table.filename().string();
  const auto of_the_table = entities(name, ending);
  if (const auto at = name.rfind(ending); at != std::string::npos) {
    name.replace(at, ending.size(), "coordsystem.json");
    if (fs::path beside = table.parent_path() / name; fs::exists(beside)) return beside;
  }
  const fs::path plain = table.parent_path() / "coordsystem.json";
  if (fs::exists(plain)) return plain;
  return of_the_table ? inherited_coordinate_file(table, *of_the_table) : fs::path();
}

/// Unit out of the side file, which is kept in `positions`.
LengthUnit stated_unit(const fs::path& table, PositionTable& positions) {
  const std::string way_out = "State it there (mm, cm or m), or name the columns x_mm, y_mm, z_mm.";
  positions.side_path = coordinate_file(table);
  if (positions.side_path.empty())
    throw InputError(fmt::format(
        "{}: the unit of x, y, z is not stated: no coordsystem.json with EEGCoordinateUnits beside "
        "the table. {}",
        table.string(), way_out));
  positions.side = read_json(positions.side_path, "coordinate system of the electrodes");
  const Json* unit =
      positions.side.is_object() ? positions.side.find("EEGCoordinateUnits") : nullptr;
  if (!unit)
    throw InputError(fmt::format("{}: no EEGCoordinateUnits, so the unit of {} is not stated. {}",
                                 positions.side_path.string(), table.filename().string(), way_out));
  if (const auto known = length_unit(*unit)) return *known;
  throw InputError(fmt::format("{}: EEGCoordinateUnits is {}, expected \"mm\", \"cm\" or \"m\". {}",
                               positions.side_path.string(), unit->dump(), way_out));
}

void read_rows(const Table& table, const std::array<std::size_t, 3>& axes,
               PositionTable& positions) {
  const std::size_t name = table.column("name");
  std::vector<Eigen::Vector3d> found;
  for (std::size_t row = 0; row < table.rows.size(); ++row) {
    const auto x = table.optional_number(row, axes[0]), y = table.optional_number(row, axes[1]),
               z = table.optional_number(row, axes[2]);
    const std::string& label = table.rows[row][name];
    if (x && y && z) {
      positions.rows.labels.push_back(label);
      found.emplace_back(*x, *y, *z);
    } else {
      positions.without_position.push_back(label);
    }
  }
  positions.rows.positions.resize(3, static_cast<Eigen::Index>(found.size()));
  for (std::size_t i = 0; i < found.size(); ++i)
    positions.rows.positions.col(static_cast<Eigen::Index>(i)) = found[i];
  if (const Labels repeated = repeated_labels(positions.rows.labels); !repeated.empty())
    throw InputError(fmt::format("{}: more than one row is named {} (upper and lower case alike).",
                                 table.source, join_labels(repeated)));
  if (found.size() < 4)
    throw InputError(
        fmt::format("{}: {} positions (rows with n/a left out), at least 4 are needed.",
                    table.source, found.size()));
}

}  // namespace

std::optional<LengthUnit> length_unit(const Json& value) {
  const std::string found = value.dump();
  for (const LengthUnit& known : kLengthUnits)
    if (found == fmt::format("\"{}\"", known.name)) return known;
  return std::nullopt;
}

PositionTable read_position_table(const fs::path& path) {
  const Table table = read_table(path, "table of electrode positions");
  PositionTable positions;
  positions.source = table.source;
  const bool unit_in_names = table.find_column("x_mm").has_value();
  if (!unit_in_names) {
    if (!table.find_column("x"))
      throw InputError(fmt::format(
          "{}: expected the columns name, x_mm, y_mm, z_mm (or name, x, y, z with the unit in a "
          "coordsystem.json), found {}.",
          table.source, join_labels(table.columns)));
    positions.unit = stated_unit(path, positions);
  }
  read_rows(table,
            unit_in_names
                ? std::array{table.column("x_mm"), table.column("y_mm"), table.column("z_mm")}
                : std::array{table.column("x"), table.column("y"), table.column("z")},
            positions);
  return positions;
}

}  // namespace headwater
