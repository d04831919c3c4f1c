// SPDX-License-Identifier: GPL-3.0-or-later
// All side files of one kind that BIDS' inheritance principle allows, nearest first.
#pragma once
#include <filesystem>
#include <string>
#include <vector>

namespace headwater {

/// One for each folder at most. Throws InputError where two of one folder fit equally well.
std::vector<std::filesystem::path> side_files(const std::filesystem::path& recording,
                                              const std::string& suffix);

}  // namespace headwater
