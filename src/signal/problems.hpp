// SPDX-License-Identifier: GPL-3.0-or-later
// Several problems in one message.
#pragma once
#include <string>
#include <vector>

namespace headwater {

/// "where: problem" for one, "where: 2 problems" and one indented line for each otherwise.
inline std::string problem_list(const std::string& where,
                                const std::vector<std::string>& problems) {
  if (problems.size() == 1) return where + ": " + problems.front();
  std::string text = where + ": " + std::to_string(problems.size()) + " problems";
  for (const std::string& problem : problems) text += "\n  - " + problem;
  return text;
}

}  // namespace headwater
