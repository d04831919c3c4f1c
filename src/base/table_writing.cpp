// SPDX-License-Identifier: GPL-3.0-or-later
// std::to_chars with a precision gives the digits of printf in the C locale, whatever the locale
// is.
#include <headwater/base/atomic_file.hpp>
#include <headwater/base/json.hpp>
#include <headwater/base/table.hpp>

#include <fmt/core.h>

#include <array>
#include <charconv>
#include <cmath>
#include <stdexcept>

namespace headwater {
namespace {

// The longest fixed number: 309 digits before the point, a sign, the point, kMostDecimals.
constexpr int kMostDecimals = 100;
using Buffer = std::array<char, 512>;

std::string_view general_digits(double value, int digits, Buffer& buffer) {
  if (std::isnan(value)) return "n/a";
  if (value == 0) return "0";  // -0 too
  const auto end = std::to_chars(buffer.data(), buffer.data() + buffer.size(), value,
                                 std::chars_format::general, digits)
                       .ptr;
  return {buffer.data(), static_cast<std::size_t>(end - buffer.data())};
}

void append_cell(std::string& text, std::string_view cell) {
  if (cell.find_first_of("\t\n\r") != std::string_view::npos)
    throw std::logic_error(fmt::format("table cell '{}' holds a tab or a line break", cell));
  text += cell.empty() ? "n/a" : cell;
}

void append_row(std::string& text, const std::vector<std::string>& cells) {
  for (std::size_t i = 0; i < cells.size(); ++i) {
    if (i > 0) text += '\t';
    append_cell(text, cells[i]);
  }
  text += '\n';
}

Json side_file(const OutputTable& table) {
  Json result = Json::object();
  result.set("Description", table.description);
  for (const auto& column : table.columns) {
    Json entry = Json::object();
    entry.set("Description", column.description);
    if (!column.unit.empty()) entry.set("Units", column.unit);
    result.set(column.name, entry);
  }
  return result;
}

}  // namespace

std::string format_number(double value, int digits) {
  if (digits < 1 || digits > kMostDecimals)
    throw std::logic_error("format_number: 1 to 100 digits");
  Buffer buffer;
  return std::string(general_digits(value, digits, buffer));
}

std::string format_fixed(double value, int decimals) {
  if (decimals < 0 || decimals > kMostDecimals)
    throw std::logic_error("format_fixed: 0 to 100 decimals");
  if (std::isnan(value)) return "n/a";
  Buffer buffer;
  const auto end = std::to_chars(buffer.data(), buffer.data() + buffer.size(), value,
                                 std::chars_format::fixed, decimals)
                       .ptr;
  const std::string_view text(buffer.data(), static_cast<std::size_t>(end - buffer.data()));
  const bool minus_nothing =
      text.front() == '-' && text.find_first_not_of("-0.") == std::string_view::npos;
  return std::string(text.substr(minus_nothing ? 1 : 0));
}

void write_table(const std::filesystem::path& path, const OutputTable& table) {
  std::vector<std::string> header;
  for (const auto& column : table.columns) header.push_back(column.name);
  std::string text;
  append_row(text, header);
  for (const auto& row : table.rows) {
    if (row.size() != header.size())
      throw std::logic_error(fmt::format("{}: a row of {} cells for {} columns", path.string(),
                                         row.size(), header.size()));
    append_row(text, row);
  }
  write_file(path, text);
  write_json(std::filesystem::path(path).replace_extension(".json"), side_file(table));
}

std::string number_table_text(const Labels& columns, const Labels& row_labels,
                              const Eigen::Ref<const Eigen::MatrixXd>& values, int digits) {
  const bool labelled = !row_labels.empty();
  if (columns.size() != static_cast<std::size_t>(values.cols()) + (labelled ? 1 : 0) ||
      (labelled && row_labels.size() != static_cast<std::size_t>(values.rows())))
    throw std::logic_error(
        fmt::format("number_table_text: {} column names and {} row labels for {} x {} values",
                    columns.size(), row_labels.size(), values.rows(), values.cols()));
  if (digits < 1 || digits > kMostDecimals)
    throw std::logic_error("number_table_text: 1 to 100 digits");
  std::string text;
  text.reserve(static_cast<std::size_t>(values.size()) * static_cast<std::size_t>(digits + 4) +
               1024);
  append_row(text, columns);
  Buffer buffer;
  for (Eigen::Index row = 0; row < values.rows(); ++row) {
    if (labelled) append_cell(text, row_labels[static_cast<std::size_t>(row)]);
    for (Eigen::Index column = 0; column < values.cols(); ++column) {
      if (labelled || column > 0) text += '\t';
      text += general_digits(values(row, column), digits, buffer);
    }
    text += '\n';
  }
  return text;
}

}  // namespace headwater
