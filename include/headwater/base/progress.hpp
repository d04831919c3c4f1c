// SPDX-License-Identifier: GPL-3.0-or-later
// Progress of a long loop, on standard error: one bar that redraws itself on a terminal, a plain
// line for each finished item elsewhere. Safe to call from several threads.
#pragma once
#include <cstddef>
#include <cstdio>
#include <memory>
#include <string>

namespace headwater {

class Progress {
 public:
  /// Prints nothing when `out` is null.
  Progress(std::FILE* out, std::size_t total, std::string what);
  ~Progress();
  Progress(const Progress&) = delete;
  Progress& operator=(const Progress&) = delete;
  /// One more item is done; `item` names it.
  void advance(const std::string& item);

 private:
  struct State;
  std::unique_ptr<State> state_;
};

}  // namespace headwater
