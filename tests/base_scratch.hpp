// SPDX-License-Identifier: GPL-3.0-or-later
// A folder of a test's own, removed at its end.
#pragma once
#include <gtest/gtest.h>
#include <unistd.h>

#include <filesystem>
#include <string>

namespace headwater {

struct Scratch {
  std::filesystem::path folder;
  Scratch() {
    const auto* test = testing::UnitTest::GetInstance()->current_test_info();
    folder = std::filesystem::temp_directory_path() /
             (std::string("headwater-") + test->test_suite_name() + "-" + test->name() + "-" +
              std::to_string(::getpid()));
    std::filesystem::remove_all(folder);
    std::filesystem::create_directories(folder);
  }
  ~Scratch() {
    std::error_code ignored;
    std::filesystem::remove_all(folder, ignored);
  }
  Scratch(const Scratch&) = delete;
  Scratch& operator=(const Scratch&) = delete;
};

/// Message of the exception of type E that `body` throws; a failure when it throws none.
template <typename E, typename Body>
std::string message_of(Body&& body) {
  try {
    body();
  } catch (const E& error) {
    return error.what();
  }
  ADD_FAILURE() << "no exception";
  return "";
}

}  // namespace headwater
