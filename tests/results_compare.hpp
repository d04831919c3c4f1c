// SPDX-License-Identifier: GPL-3.0-or-later
// Reads results back, and compares two results folders cell by cell.
#pragma once
#include "program.hpp"

#include <headwater/base/table.hpp>
#include <headwater/base/units.hpp>

#include <Eigen/Core>
#include <gtest/gtest.h>

#include <algorithm>
#include <charconv>
#include <cmath>
#include <optional>
#include <string>

namespace headwater {

inline std::optional<double> cell_number(const std::string& cell) {
  double value = 0;
  const auto [end, error] = std::from_chars(cell.data(), cell.data() + cell.size(), value);
  if (error != std::errc() || end != cell.data() + cell.size()) return {};
  return value;
}

/// What one step of the last written digit is worth.
inline double last_digit(const std::string& cell) {
  const auto exponent_at = cell.find_first_of("eE");
  const std::string digits = cell.substr(0, exponent_at);
  const double exponent =
      exponent_at == std::string::npos ? 0 : std::stod(cell.substr(exponent_at + 1));
  const auto point = digits.find('.');
  const auto decimals = point == std::string::npos ? 0 : digits.size() - point - 1;
  return std::pow(10.0, exponent - static_cast<double>(decimals));
}

/// Numbers may differ by one step of the last digit written and `share` of the column's largest.
inline void expect_same_table(const std::filesystem::path& a, const std::filesystem::path& b,
                              double share) {
  Table first = read_table(a, "table"), second = read_table(b, "table");
  if (first.columns[0] == "name")  // leads, in the order of the data: joined by name
    for (Table* table : {&first, &second}) std::sort(table->rows.begin(), table->rows.end());
  ASSERT_EQ(first.columns, second.columns) << a;
  ASSERT_EQ(first.rows.size(), second.rows.size()) << a;
  for (std::size_t k = 0; k < first.columns.size(); ++k) {
    double largest = 0;
    for (const auto& row : first.rows)
      if (const auto value = cell_number(row[k])) largest = std::max(largest, std::abs(*value));
    for (std::size_t row = 0; row < first.rows.size(); ++row) {
      const std::string &x = first.rows[row][k], &y = second.rows[row][k];
      const auto p = cell_number(x), q = cell_number(y);
      if (p && q) {
        EXPECT_NEAR(*p, *q, 1.01 * std::min(last_digit(x), last_digit(y)) + share * largest)
            << a << ", row " << row + 1 << ", " << first.columns[k];
      } else {
        EXPECT_EQ(x, y) << a << ", row " << row + 1 << ", " << first.columns[k];
      }
    }
  }
}

/// Every table of the two folders but those whose names hold one of `skipped`; returns how many.
inline int expect_same_tables(const std::filesystem::path& a, const std::filesystem::path& b,
                              double share, const Labels& skipped = {}) {
  int compared = 0;
  for (const auto& [name, bytes] : files_below(a)) {
    const bool skip = std::any_of(skipped.begin(), skipped.end(),
                                  [&](const auto& part) { return holds(name, part); });
    if (!name.ends_with(".tsv") || skip) continue;
    expect_same_table(a / name, b / name, share);
    ++compared;
  }
  EXPECT_EQ(files_below(a).size(), files_below(b).size());
  return compared;
}

/// Numbers of a table whose first column holds names or times; the columns' names on the side.
struct Numbers {
  Labels names, columns;
  Eigen::MatrixXd values;
};

inline Numbers read_numbers(const std::filesystem::path& path) {
  const Table table = read_table(path, "numbers");
  Numbers numbers;
  numbers.columns.assign(table.columns.begin() + 1, table.columns.end());
  numbers.values.resize(static_cast<Eigen::Index>(table.rows.size()),
                        static_cast<Eigen::Index>(numbers.columns.size()));
  for (std::size_t row = 0; row < table.rows.size(); ++row) {
    numbers.names.push_back(table.rows[row][0]);
    for (std::size_t k = 0; k < numbers.columns.size(); ++k)
      numbers.values(static_cast<Eigen::Index>(row), static_cast<Eigen::Index>(k)) =
          table.number(row, k + 1);
  }
  return numbers;
}

/// Rows of a table in which the named columns hold the given texts.
inline std::vector<std::size_t> rows_with(
    const Table& table, const std::vector<std::pair<std::string, std::string>>& wanted) {
  std::vector<std::size_t> rows;
  for (std::size_t row = 0; row < table.rows.size(); ++row)
    if (std::all_of(wanted.begin(), wanted.end(), [&](const auto& cell) {
          return table.rows[row][table.column(cell.first)] == cell.second;
        }))
      rows.push_back(row);
  return rows;
}

inline Eigen::Vector3d place_mm(const Table& table, std::size_t row) {
  return {table.number(row, table.column("x_mm")), table.number(row, table.column("y_mm")),
          table.number(row, table.column("z_mm"))};
}

}  // namespace headwater
