// SPDX-License-Identifier: GPL-3.0-or-later
// The files of templates/, compiled into the library: nothing has to be found at run time.
#pragma once
#include <string_view>

namespace headwater {

/// Content of templates/<name>, e.g. "gyri.tsv". Throws std::logic_error for an unknown name.
std::string_view embedded_file(std::string_view name);

}  // namespace headwater
