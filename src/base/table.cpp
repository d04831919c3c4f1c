// SPDX-License-Identifier: GPL-3.0-or-later
#include "base/table_text.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/table.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <charconv>
#include <cmath>
#include <set>

namespace headwater {
namespace {

constexpr std::string_view kByteOrderMark = "\xef\xbb\xbf";

/// A cell as it may stand in a message: short and printable.
std::string shown(std::string_view cell) {
  constexpr std::size_t kLongest = 40;
  std::string result;
  for (const char c : cell.substr(0, kLongest))
    result.push_back(static_cast<unsigned char>(c) < 0x20 ? '?' : c);
  return "'" + result + (cell.size() > kLongest ? "..." : "") + "'";
}

std::string not_a_number(const std::string& source, int line, const std::string& column,
                         std::string_view cell) {
  std::string advice;
  if (cell.find(',') != std::string_view::npos) advice = " Write the decimal sign as a point.";
  return fmt::format("{}, line {}, column '{}': found {}, expected a finite number.{}", source,
                     line, column, shown(cell), advice);
}

/// Text after an optional byte-order mark; refuses what cannot be a UTF-8 table.
std::string_view checked_text(std::string_view text, const std::string& source) {
  if (text.substr(0, 3) == kByteOrderMark) text.remove_prefix(3);
  if (text.find('\0') != std::string_view::npos)
    throw InputError(
        source +
        ": holds NUL bytes, expected a tab-separated text table. If it is a UTF-16 text, "
        "save it as UTF-8.");
  return text;
}

void check_columns(const Labels& columns, const std::string& source, std::string_view header) {
  if (columns.size() == 1 && columns[0].empty())
    throw InputError(source + ": line 1 is empty, expected the column names.");
  if (header.find('\r') != std::string_view::npos)
    throw InputError(source + ": lines end in a carriage return alone. Save it with LF or CRLF.");
  if (columns.size() == 1)
    for (const auto& [sign, name] : {std::pair{',', "commas"}, std::pair{';', "semicolons"}})
      if (header.find(sign) != std::string_view::npos)
        throw InputError(
            fmt::format("{}: cells are separated by {}, expected tabs. Save it as a "
                        "tab-separated table.",
                        source, name));
  std::set<std::string> seen, repeated;
  for (std::size_t i = 0; i < columns.size(); ++i) {
    if (columns[i].empty())
      throw InputError(
          fmt::format("{}, line 1: column {} of {} has no name.", source, i + 1, columns.size()));
    if (!seen.insert(columns[i]).second) repeated.insert(columns[i]);
  }
  if (!repeated.empty())
    throw InputError(fmt::format("{}, line 1: repeated column names: {}. Each name may stand once.",
                                 source, join_labels({repeated.begin(), repeated.end()})));
}

[[noreturn]] void refuse_ragged(const std::string& source, int line, std::string_view text,
                                std::size_t found, std::size_t expected) {
  if (text.empty())
    throw InputError(
        fmt::format("{}, line {}: the line is empty, expected {} cells.", source, line, expected));
  throw InputError(
      fmt::format("{}, line {}: {} cells found, {} expected.", source, line, found, expected));
}

/// One line of numbers into a row of the table, straight from the text.
void parse_numbers(NumberTable& table, Eigen::Index row, std::string_view line, int number) {
  const auto refuse = [&] {
    refuse_ragged(table.source, number, line, line.empty() ? 0 : split_cells(line).size(),
                  table.columns.size());
  };
  const auto width = table.values.cols();
  const char *at = line.data(), *const end = at + line.size();
  for (Eigen::Index column = 0;; ++column) {
    double value = 0;
    auto [after, error] = std::from_chars(at, end, value);
    if (error != std::errc() || (after != end && *after != '\t') || !std::isfinite(value)) {
      // Off the fast path: blanks and a plus sign are let pass; a wrong number of cells comes
      // first.
      if (line.empty() || std::count(line.begin(), line.end(), '\t') + 1 != width) refuse();
      after = std::find(at, end, '\t');
      const std::string_view cell(at, static_cast<std::size_t>(after - at));
      const auto slow = finite_number(cell);
      const auto& name = table.columns[static_cast<std::size_t>(column)];
      if (!slow) throw InputError(not_a_number(table.source, number, name, cell));
      value = *slow;
    }
    if ((after == end) != (column + 1 == width)) refuse();
    table.values(row, column) = value;
    if (after == end) return;
    at = after + 1;
  }
}

}  // namespace

LineReader::LineReader(std::string_view text) : rest_(text) {
  while (!rest_.empty() && (rest_.back() == '\n' || rest_.back() == '\r')) rest_.remove_suffix(1);
}

std::size_t LineReader::lines_left() const {
  return done_ ? 0 : 1 + static_cast<std::size_t>(std::count(rest_.begin(), rest_.end(), '\n'));
}

bool LineReader::next(std::string_view& line) {
  if (done_) return false;
  const auto end = rest_.find('\n');
  done_ = end == std::string_view::npos;
  line = rest_.substr(0, end);
  if (!done_) rest_.remove_prefix(end + 1);
  if (!line.empty() && line.back() == '\r') line.remove_suffix(1);
  ++number_;
  return true;
}

std::vector<std::string> split_cells(std::string_view line) {
  std::vector<std::string> cells;
  for (;;) {
    const auto tab = line.find('\t');
    cells.emplace_back(line.substr(0, tab));
    if (tab == std::string_view::npos) return cells;
    line.remove_prefix(tab + 1);
  }
}

std::optional<double> finite_number(std::string_view cell) {
  while (!cell.empty() && cell.front() == ' ') cell.remove_prefix(1);
  while (!cell.empty() && cell.back() == ' ') cell.remove_suffix(1);
  if (cell.size() > 1 && cell.front() == '+' && cell[1] != '-') cell.remove_prefix(1);
  double value = 0;
  const auto [end, error] = std::from_chars(cell.data(), cell.data() + cell.size(), value);
  if (error != std::errc() || end != cell.data() + cell.size() || !std::isfinite(value))
    return std::nullopt;
  return value;
}

std::optional<std::size_t> Table::find_column(std::string_view name) const {
  const auto found = find_label(columns, name);
  if (!found) return std::nullopt;
  return static_cast<std::size_t>(*found);
}

std::size_t Table::column(std::string_view name) const {
  if (const auto found = find_column(name)) return *found;
  throw InputError(fmt::format("{}: no column '{}'.{} Columns found: {}.", source, name,
                               did_you_mean(name, columns), join_labels(columns)));
}

double Table::number(std::size_t row, std::size_t column) const {
  const std::string& cell = rows.at(row).at(column);
  if (const auto value = finite_number(cell)) return *value;
  throw InputError(not_a_number(source, lines.at(row), columns.at(column), cell));
}

std::optional<double> Table::optional_number(std::size_t row, std::size_t column) const {
  const std::string& cell = rows.at(row).at(column);
  if (cell.empty() || cell == "n/a") return std::nullopt;
  return number(row, column);
}

Table parse_table(std::string_view text, const std::string& source) {
  Table table{source, {}, {}, {}};
  LineReader reader(checked_text(text, source));
  std::string_view line;
  reader.next(line);
  table.columns = split_cells(line);
  check_columns(table.columns, source, line);
  while (reader.next(line)) {
    table.rows.push_back(split_cells(line));
    table.lines.push_back(reader.number());
    if (table.rows.back().size() != table.columns.size() ||
        (line.empty() && table.columns.size() > 1))
      refuse_ragged(source, reader.number(), line, table.rows.back().size(), table.columns.size());
  }
  if (table.rows.empty()) throw InputError(source + ": no rows below the column names.");
  return table;
}

Table read_table(const std::filesystem::path& path, std::string_view what) {
  return parse_table(read_file(path, what), path.string());
}

NumberTable parse_number_table(std::string_view text, const std::string& source) {
  text = checked_text(text, source);
  LineReader reader(text);
  std::string_view line;
  reader.next(line);
  NumberTable table{source, split_cells(line), {}};
  check_columns(table.columns, source, line);

  // A good row has a digit and a tab or line end for each column: what a ragged table would waste
  // is bounded by its own size.
  const std::size_t most = text.size() / (2 * table.columns.size()) + 1;
  const std::size_t rows = std::min(reader.lines_left(), most);
  if (rows == 0) throw InputError(source + ": no rows below the column names.");
  table.values.resize(static_cast<Eigen::Index>(rows),
                      static_cast<Eigen::Index>(table.columns.size()));
  for (Eigen::Index row = 0; reader.next(line); ++row)
    parse_numbers(table, row, line, reader.number());
  return table;
}

NumberTable read_number_table(const std::filesystem::path& path, std::string_view what) {
  return parse_number_table(read_file(path, what), path.string());
}

}  // namespace headwater
