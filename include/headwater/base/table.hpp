// SPDX-License-Identifier: GPL-3.0-or-later
// Tab-separated tables in the BIDS manner: one header line, UTF-8 (a byte-order mark is skipped),
// LF or CRLF, "n/a" for missing. Written tables have a JSON file beside them that describes each
// column (unit, meaning).
#pragma once
#include <headwater/base/labels.hpp>

#include <Eigen/Core>

#include <filesystem>
#include <optional>
#include <string>
#include <string_view>
#include <vector>

namespace headwater {

/// A table of text cells. Row i stood on line `lines[i]` of `source`.
struct Table {
  std::string source;
  Labels columns;
  std::vector<std::vector<std::string>> rows;
  std::vector<int> lines;

  /// Position of a column that must be there; throws InputError that lists the columns found.
  std::size_t column(std::string_view name) const;
  std::optional<std::size_t> find_column(std::string_view name) const;
  /// Cell as a finite number; throws InputError with file, line, column, what was found.
  double number(std::size_t row, std::size_t column) const;
  /// Same, but "n/a" and "" give no value.
  std::optional<double> optional_number(std::size_t row, std::size_t column) const;
};

/// Errors (InputError): missing file, no header, repeated or empty column names, ragged rows (line,
/// cells found, cells expected), no rows, NUL bytes. Blank lines at the end are ignored; a comma-
/// or semicolon-separated file is named as such.
Table read_table(const std::filesystem::path& path, std::string_view what);
Table parse_table(std::string_view text, const std::string& source);

/// A table of numbers, e.g. an average: values is #rows by #columns.
struct NumberTable {
  std::string source;
  Labels columns;
  Eigen::MatrixXd values;
};

/// Fast path for all-number tables (at least 100 MB/s). Every cell must be a finite decimal number:
/// otherwise InputError with file, line, column name and the text found. Same errors as read_table.
NumberTable read_number_table(const std::filesystem::path& path, std::string_view what);
NumberTable parse_number_table(std::string_view text, const std::string& source);

/// A column to be written, with its entry in the JSON side file. `unit` may be empty.
struct ColumnInfo {
  std::string name;
  std::string description;
  std::string unit;
};

struct OutputTable {
  std::string description;  ///< what the table holds, for the side file
  std::vector<ColumnInfo> columns;
  std::vector<std::vector<std::string>> rows;
};

/// Writes path (.tsv) and the same name with .json. Cells must hold no tab or line break
/// (std::logic_error). Each file is written atomically.
void write_table(const std::filesystem::path& path, const OutputTable& table);

/// The shortest text with `digits` significant digits ("%.*g", locale-free); NaN gives "n/a".
/// 17 digits read back to the same double.
std::string format_number(double value, int digits = 6);

/// Rounded to `decimals` after the point, no exponent, "-0.0" written "0.0"; NaN gives "n/a".
std::string format_fixed(double value, int decimals);

/// Large number tables: header line, then one line for each row of `values`, with an optional
/// first text column (`row_labels`, empty: none).
std::string number_table_text(const Labels& columns, const Labels& row_labels,
                              const Eigen::Ref<const Eigen::MatrixXd>& values, int digits);

}  // namespace headwater
