// SPDX-License-Identifier: GPL-3.0-or-later
// Files are written whole or not at all: a temporary name in the same folder, fsync, rename.
#pragma once
#include <filesystem>
#include <string>
#include <string_view>

namespace headwater {

/// Writes `bytes` to `path`, creating missing folders. A failure leaves an older file of that name
/// as it was and no temporary file behind. Throws ResourceError naming path and reason.
void write_file(const std::filesystem::path& path, std::string_view bytes);

/// Whole content. Throws InputError when the file is missing or unreadable; `what` says what the
/// file was meant to be ("participants table").
std::string read_file(const std::filesystem::path& path, std::string_view what);

}  // namespace headwater
