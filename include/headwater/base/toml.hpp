// SPDX-License-Identifier: GPL-3.0-or-later
// A TOML document as a tree that knows where each value stood (line and column, from 1).
#pragma once
#include <filesystem>
#include <string>
#include <string_view>
#include <utility>
#include <variant>
#include <vector>

namespace headwater {

struct TomlValue {
  using Array = std::vector<TomlValue>;
  using Table = std::vector<std::pair<std::string, TomlValue>>;  ///< in document order

  std::variant<bool, long long, double, std::string, Array, Table> value;
  int line = 0;  ///< where the value stands
  int column = 0;

  bool is_table() const { return std::holds_alternative<Table>(value); }
  bool is_array() const { return std::holds_alternative<Array>(value); }
  bool is_text() const { return std::holds_alternative<std::string>(value); }
  bool is_number() const {
    return std::holds_alternative<long long>(value) || std::holds_alternative<double>(value);
  }
  double number() const;                              ///< integers too
  const TomlValue* find(std::string_view key) const;  ///< member of a table, or null
  /// "a number", "text", "a list", "a table", "true or false": for messages.
  std::string kind() const;
};

/// Throws ExperimentError "file:line:column: reason" on a syntax error or a missing file. Dates and
/// times are read as text.
TomlValue read_toml(const std::filesystem::path& path);
TomlValue parse_toml(std::string_view text, const std::string& source);

}  // namespace headwater
