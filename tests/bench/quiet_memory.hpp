// SPDX-License-Identifier: GPL-3.0-or-later
// Results of tens of megabytes are mapped afresh at each call by default, and the page faults on
// that memory cost more than the arithmetic (for a lead field of 64 by 15198 about twice as much).
// Benchmarks keep freed memory, as a process that works on one participant after another does.
#pragma once
#include <malloc.h>

namespace headwater {

inline const bool kMemoryKept = [] {
  mallopt(M_MMAP_THRESHOLD, 1 << 30);
  mallopt(M_TRIM_THRESHOLD, 2'000'000'000);
  return true;
}();

}  // namespace headwater
