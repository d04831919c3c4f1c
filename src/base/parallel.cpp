// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/parallel.hpp>

#include <tbb/info.h>
#include <tbb/parallel_for.h>
#include <tbb/task_arena.h>

#include <algorithm>

namespace headwater {

void parallel_for(std::size_t count, int jobs, const std::function<void(std::size_t)>& body) {
  if (jobs == 1 || count < 2) {
    for (std::size_t i = 0; i < count; ++i) body(i);
    return;
  }
  // No more than the machine has: oneTBB would not start them, and says so on standard error.
  const int machine = tbb::info::default_concurrency();
  tbb::task_arena arena(jobs > 0 ? std::min(jobs, machine) : machine);
  // Isolated: a thread that waits inside a body must not start another item of an outer loop.
  arena.execute([&] {
    tbb::this_task_arena::isolate([&] { tbb::parallel_for(std::size_t{0}, count, body); });
  });
}

}  // namespace headwater
