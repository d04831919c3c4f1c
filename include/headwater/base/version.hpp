// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once
#include <string>

namespace headwater {

/// "0.1.0"
std::string version();

/// The caution that accompanies every result: research use, template head, centimetres.
std::string caution();

}  // namespace headwater
