// SPDX-License-Identifier: GPL-3.0-or-later
// The lead field of one participant - 64 electrodes, the 6 mm lattice, default shells, 1e-9 - by
// the fast kernel and by its plain twin, in one run on one core, so that their ratio means
// something.
#include "quiet_memory.hpp"
#include "reference/lead_field.hpp"

#include <headwater/model/head.hpp>
#include <headwater/model/lead_field.hpp>
#include <headwater/model/source_grid.hpp>

#include <Eigen/Core>
#include <benchmark/benchmark.h>

#include <cmath>

namespace {

/// 64 directions over the upper two thirds of the sphere, spread by the golden angle.
Eigen::Matrix3Xd cap_directions() {
  constexpr int kElectrodes = 64;
  Eigen::Matrix3Xd directions(3, kElectrodes);
  for (int k = 0; k < kElectrodes; ++k) {
    const double z = 1 - 1.33 * (k + 0.5) / kElectrodes, angle = 2.399963229728653 * k;
    const double s = std::sqrt(1 - z * z);
    directions.col(k) << s * std::cos(angle), s * std::sin(angle), z;
  }
  return directions;
}

template <typename Kernel>
void time_kernel(benchmark::State& state, Kernel kernel) {
  const headwater::HeadModel head = headwater::default_head();
  const double scalp = head.radii_m(head.radii_m.size() - 1);
  const Eigen::Matrix3Xd points = headwater::lattice_grid(6e-3, scalp).head_m;
  const Eigen::Matrix3Xd electrodes = cap_directions();
  for (auto _ : state) benchmark::DoNotOptimize(kernel(head, electrodes, points));
  state.counters["points"] = static_cast<double>(points.cols());
}

void lead_field_fast(benchmark::State& state) {
  time_kernel(state, headwater::compute_gain);
}
void lead_field_plain(benchmark::State& state) {
  time_kernel(state, headwater::reference::compute_gain);
}

BENCHMARK(lead_field_fast)->Unit(benchmark::kMillisecond);
BENCHMARK(lead_field_plain)->Unit(benchmark::kMillisecond);

}  // namespace
