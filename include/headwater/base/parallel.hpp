// SPDX-License-Identifier: GPL-3.0-or-later
// Parallel loops over independent items (oneTBB). The result must not depend on the number of jobs:
// each item writes only its own slot.
#pragma once
#include <cstddef>
#include <functional>

namespace headwater {

/// Calls body(i) for i in [0, count) on at most `jobs` threads (0: as many as the machine has). The
/// first exception of a body stops the loop and is rethrown.
void parallel_for(std::size_t count, int jobs, const std::function<void(std::size_t)>& body);

}  // namespace headwater
