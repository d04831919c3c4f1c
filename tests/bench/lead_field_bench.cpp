// SPDX-License-Identifier: GPL-3.0-or-later
// Lead field of 64 electrodes and the 5066 points of the 6 mm lattice, one thread: the fast kernel
// and its plain twin. Counter per_second: potentials (electrode, point and direction).
#include "quiet_memory.hpp"
#include "reference/lead_field.hpp"

#include <headwater/model/head.hpp>
#include <headwater/model/lead_field.hpp>
#include <headwater/model/source_grid.hpp>
#include <headwater/signal/electrodes.hpp>
#include <headwater/signal/standard_cap.hpp>

#include <benchmark/benchmark.h>

namespace headwater {
namespace {

struct LeadFieldCase {
  HeadModel head = default_head();
  Eigen::Matrix3Xd electrodes, points;
  LeadFieldCase() {
    Labels names;  // spread over the whole cap
    for (std::size_t i = 0; names.size() < 64; i += standard_names().size() / 64)
      names.push_back(standard_names()[i]);
    electrodes = standard_montage(names, 0.092).positions;
    points = lattice_grid(6e-3, 0.092).head_m;
  }
};

template <typename Kernel>
void run(benchmark::State& state, const Kernel& kernel) {
  static const LeadFieldCase input;
  Eigen::MatrixXd gain;
  for (auto _ : state) {
    gain = kernel(input.head, input.electrodes, input.points);
    benchmark::DoNotOptimize(gain.data());
  }
  state.counters["per_second"] = benchmark::Counter(static_cast<double>(gain.size()),
                                                    benchmark::Counter::kIsIterationInvariantRate);
}

void lead_field(benchmark::State& state) {
  run(state, compute_gain);
}
void lead_field_twin(benchmark::State& state) {
  run(state, reference::compute_gain);
}

BENCHMARK(lead_field)->Unit(benchmark::kMillisecond);
BENCHMARK(lead_field_twin)->Unit(benchmark::kMillisecond);

}  // namespace
}  // namespace headwater
