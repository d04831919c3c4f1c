// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/parallel.hpp>

#include <tbb/parallel_for.h>
#include <tbb/task_arena.h>

namespace headwater {

void parallel_for(std::size_t count, int jobs, const std::function<void(std::size_t)>& body) {
  if (jobs == 1 || count < 2) {
    for (std::size_t i = 0; i < count; ++i) body(i);
    return;
  }
  tbb::task_arena arena(jobs > 0 ? jobs : tbb::task_arena::automatic);
  // Isolated: a thread that waits inside a body must not start another item of an outer loop.
  arena.execute([&] {
    tbb::this_task_arena::isolate([&] { tbb::parallel_for(std::size_t{0}, count, body); });
  });
}

}  // namespace headwater
