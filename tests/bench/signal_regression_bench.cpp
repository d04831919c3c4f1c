// SPDX-License-Identifier: GPL-3.0-or-later
// Regression of 1000 trials x 64 leads x 300 samples on 6 regressors in 2 conditions, beside the
// matrix product that it cannot do without: the data, one column for each trial, times X. Counter
// times_bare: all over bare, measured in turns.
#include "quiet_memory.hpp"

#include <headwater/base/random.hpp>
#include <headwater/signal/regression.hpp>

#include <benchmark/benchmark.h>

#include <chrono>
#include <string>

namespace headwater {
namespace {

constexpr Eigen::Index kTrials = 1000, kLeads = 64, kSamples = 300, kRegressors = 6;

struct RegressionCase {
  Trials trials;
  std::vector<Regressor> regressors;
  Eigen::MatrixXd x;
  RegressionCase() {
    RandomStream random(1, "regression");
    trials.channels.assign(kLeads, "lead");
    trials.times_s = Eigen::VectorXd::LinSpaced(kSamples, -0.1, 1.1);
    trials.conditions = {"rare", "frequent"};
    for (std::size_t k = 0; k < kTrials; ++k) {
      trials.condition.push_back(k % 5 == 0 ? 0 : 1);
      trials.event_row.push_back(k);
    }
    // Speed does not depend on the values: a short stretch of noise, repeated.
    const Eigen::MatrixXd noise = 1e-5 * random.normal_matrix(kLeads, kSamples + 101);
    trials.data_V.resize(kLeads, kSamples * kTrials);
    for (Eigen::Index k = 0; k < kTrials; ++k)
      trials.data_V.middleCols(k * kSamples, kSamples) = noise.middleCols(k % 101, kSamples);
    for (Eigen::Index j = 0; j < kRegressors; ++j)
      regressors.push_back({std::to_string(j), random.normal_matrix(kTrials, 1).col(0)});
    x = random.normal_matrix(kTrials, kRegressors + 2);
  }
};

double seconds(const std::chrono::steady_clock::time_point& since) {
  return std::chrono::duration<double>(std::chrono::steady_clock::now() - since).count();
}

void regression(benchmark::State& state) {
  static const RegressionCase work;
  const auto blocks = static_cast<int>(state.range(0));
  const Eigen::Map<const Eigen::MatrixXd> columns(work.trials.data_V.data(), kLeads * kSamples,
                                                  kTrials);
  double bare_s = 0, all_s = 0;
  for (auto _ : state) {
    auto start = std::chrono::steady_clock::now();
    const Eigen::MatrixXd product = columns * work.x;
    benchmark::DoNotOptimize(product.data());
    bare_s += seconds(start);
    start = std::chrono::steady_clock::now();
    const RegressionResult result = regress(work.trials, work.regressors, {}, blocks);
    benchmark::DoNotOptimize(result.beta_V.front().data());
    const double spent = seconds(start);
    all_s += spent;
    state.SetIterationTime(spent);
  }
  state.counters["times_bare"] = all_s / bare_s;
  state.counters["bare_ms"] = 1e3 * bare_s / static_cast<double>(state.iterations());
}
BENCHMARK(regression)
    ->ArgName("blocks")
    ->Arg(0)
    ->Arg(10)
    ->UseManualTime()
    ->Unit(benchmark::kMillisecond);

}  // namespace
}  // namespace headwater
