// SPDX-License-Identifier: GPL-3.0-or-later
// Lines and cells of tab-separated text.
#pragma once
#include <optional>
#include <string>
#include <string_view>
#include <vector>

namespace headwater {

/// Lines of a text without their LF or CRLF; blank lines at the end are left out. An empty text has
/// one empty line.
class LineReader {
 public:
  explicit LineReader(std::string_view text);
  bool next(std::string_view& line);
  std::size_t lines_left() const;
  int number() const { return number_; }  ///< of the line last given, from 1

 private:
  std::string_view rest_;
  int number_ = 0;
  bool done_ = false;
};

std::vector<std::string> split_cells(std::string_view line);

/// A finite decimal number with a point; blanks around it and a plus sign are let pass.
std::optional<double> finite_number(std::string_view cell);

}  // namespace headwater
