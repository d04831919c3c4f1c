// SPDX-License-Identifier: GPL-3.0-or-later
// An error is there to be read: its type, and the words that its message must hold.
#pragma once
#include "base_scratch.hpp"

#include <gtest/gtest.h>

#include <string>
#include <vector>

namespace headwater {

template <typename Expected, typename Body>
void expect_error(Body&& body, const std::vector<std::string>& words) {
  const std::string message = message_of<Expected>(body);
  for (const std::string& word : words)
    EXPECT_NE(message.find(word), std::string::npos) << "no '" << word << "' in: " << message;
}

}  // namespace headwater
