// SPDX-License-Identifier: GPL-3.0-or-later
// zlib's home: the gzip format of .nii.gz and the zlib format inside .vti.
#pragma once
#include <cstddef>
#include <string>
#include <string_view>

namespace headwater {

/// A gzip member, level 1, without name or time: equal bytes in give equal bytes out.
std::string gzip(std::string_view bytes);

/// True for the two bytes that start every gzip file.
bool is_gzip(std::string_view bytes);

/// The first `most` bytes of what the gzip members hold; fewer when they hold fewer or end early.
/// Memory grows with what is really there. Throws std::runtime_error on damaged data.
std::string gunzip(std::string_view bytes, std::size_t most);

/// A zlib stream, level 1.
std::string deflate_block(std::string_view bytes);

}  // namespace headwater
