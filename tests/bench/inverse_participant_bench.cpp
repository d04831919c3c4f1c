// SPDX-License-Identifier: GPL-3.0-or-later
// One participant - 64 leads, 7 mm lattice, 180 samples, 3 contrasts - through minimum norm,
// sLORETA, LCMV, region courses and indices, beside the matrix products that none of it can do
// without (see bare()). Counter times_bare: all over bare, measured in turns.
#include "quiet_memory.hpp"

#include <headwater/base/random.hpp>
#include <headwater/inverse/indices.hpp>
#include <headwater/inverse/influence.hpp>
#include <headwater/inverse/lcmv.hpp>
#include <headwater/inverse/minimum_norm.hpp>
#include <headwater/inverse/region_courses.hpp>
#include <headwater/inverse/regularisation.hpp>
#include <headwater/inverse/sloreta.hpp>
#include <headwater/model/lead_field.hpp>
#include <headwater/model/regions.hpp>
#include <headwater/signal/electrodes.hpp>
#include <headwater/signal/standard_cap.hpp>

#include <benchmark/benchmark.h>

#include <chrono>

namespace headwater {
namespace {

using Eigen::MatrixXd;

constexpr double kNoiseScale = 0.01;
constexpr int kContrasts = 3;
const SampleRange kWindow{100, 40};

struct ContrastCase {
  SourceGrid grid = lattice_grid(7e-3, 0.092);
  Eigen::Matrix3Xd outward = grid.head_m.colwise().normalized();
  std::vector<Region> lobes = lobe_regions(template_labels(grid));
  Subspace subspace;
  MatrixXd data, data_covariance;
  ContrastCase() {
    Labels names;
    for (std::size_t i = 0; names.size() < 64; i += standard_names().size() / 64)
      names.push_back(standard_names()[i]);
    const MatrixXd gain =
        compute_gain(default_head(), standard_montage(names, 0.092).positions, grid.head_m);
    subspace = make_subspace(names, gain, 1e-10 * MatrixXd::Identity(63, 63));
    RandomStream random(1, "bench");
    data = 1e-6 * random.normal_matrix(64, 180) +
           gain.middleCols<3>(3000) * (2e-8 * random.normal_matrix(3, 180));
    const MatrixXd y = subspace.basis.transpose() * data;
    data_covariance = y * y.transpose() / 180.0;
  }
};

void follow(const ContrastCase& c, const SourceOperator& inverse) {
  const SourceEstimate estimate = estimate_sources(inverse, c.data);
  const auto forms = region_forms(inverse, c.lobes);
  benchmark::DoNotOptimize(estimate.amplitude.data());
  const RegionCourses courses = region_courses(inverse, forms, c.data, c.lobes, c.outward);
  const auto indices =
      PowerIndices(inverse, forms, c.subspace.basis, kNoiseScale * c.subspace.noise_V2, c.lobes, {})
          .at(c.data, kWindow);
  benchmark::DoNotOptimize(courses.projected.data());
  benchmark::DoNotOptimize(indices.data());
}

template <typename Ridge>
void follow_ridge(const ContrastCase& c, const Ridge& inverse) {
  const MatrixXd z = spectrum_map(c.subspace, inverse.spectrum()) *
                     c.data.middleCols(kWindow.first, kWindow.count) / std::sqrt(kNoiseScale);
  const double lambda = choose_regularisation(inverse.spectrum().values / kNoiseScale, z, {}).used;
  follow(c, inverse.at(lambda, kNoiseScale));
}

/// One participant: three methods factorised once, each applied to three contrasts.
void whole(const ContrastCase& c) {
  const MinimumNorm minimum_norm(c.subspace, 0.8);
  const Sloreta sloreta(c.subspace);
  const Lcmv lcmv(c.subspace, c.data_covariance, c.outward, c.grid.mirror, {});
  for (int k = 0; k < kContrasts; ++k) {
    follow_ridge(c, minimum_norm);
    follow_ridge(c, sloreta);
    follow(c, lcmv.at(kNoiseScale));
  }
}

/// The products without which none of it can be had: gram matrices and projected lead fields of the
/// two ridge methods; whitened lead field and its noise for LCMV; and for each contrast and method
/// the source courses and the gram matrix of each lobe's rows.
void bare(const ContrastCase& c) {
  const MatrixXd &k = c.subspace.whitened_gain, &square = c.subspace.whitener;
  const MatrixXd z = c.subspace.basis.transpose() * c.data;
  MatrixXd gram = MatrixXd::Zero(k.rows(), k.rows()), turned, sources;
  for (int twice = 0; twice < 2; ++twice) gram.selfadjointView<Eigen::Lower>().rankUpdate(k);
  for (int times = 0; times < 4; ++times) turned.noalias() = square * k;
  for (int times = 0; times < 3 * kContrasts; ++times) {
    sources.noalias() = turned.transpose() * z;
    gram.selfadjointView<Eigen::Lower>().rankUpdate(turned);
    benchmark::DoNotOptimize(sources.data());
  }
  benchmark::DoNotOptimize(gram.data());
}

void participant(benchmark::State& state) {
  static const ContrastCase input;
  using Clock = std::chrono::steady_clock;
  std::chrono::duration<double> all{0}, least{0};
  for (auto _ : state) {
    const auto start = Clock::now();
    bare(input);
    const auto middle = Clock::now();
    whole(input);
    const auto end = Clock::now();
    least += middle - start;
    all += end - middle;
    state.SetIterationTime(std::chrono::duration<double>(end - middle).count());
  }
  state.counters["times_bare"] = all.count() / least.count();
  state.counters["bare_ms"] = 1e3 * least.count() / static_cast<double>(state.iterations());
}

/// Every lead left out in turn, of every contrast and method of one participant: map, peak and
/// indices without it. Counter times_locate: over locating the participant once, measured in turns.
void leads_left_out(benchmark::State& state) {
  static const ContrastCase input;
  using Clock = std::chrono::steady_clock;
  const MinimumNorm minimum_norm(input.subspace, 0.8);
  const Sloreta sloreta(input.subspace);
  const Lcmv lcmv(input.subspace, input.data_covariance, input.outward, input.grid.mirror, {});
  const SourceOperator operators[] = {minimum_norm.at(1e9, kNoiseScale),
                                      sloreta.at(1e9, kNoiseScale), lcmv.at(kNoiseScale)};
  const MatrixXd window = input.data.middleCols(kWindow.first, kWindow.count);
  std::chrono::duration<double> located{0}, left_out{0};
  for (auto _ : state) {
    const auto start = Clock::now();
    whole(input);
    const auto middle = Clock::now();
    for (int k = 0; k < kContrasts; ++k)
      for (const auto& inverse : operators) {
        const LeadDeletion deletion = delete_leads(inverse, window);
        for (Eigen::Index m = 0; m < deletion.power.cols(); ++m) {
          Eigen::Index peak = 0;
          deletion.power.col(m).maxCoeff(&peak);
          const auto indices = index_values(deletion.power.col(m), input.lobes);
          benchmark::DoNotOptimize(peak);
          benchmark::DoNotOptimize(indices.data());
        }
      }
    const auto end = Clock::now();
    located += middle - start;
    left_out += end - middle;
    state.SetIterationTime(std::chrono::duration<double>(end - middle).count());
  }
  state.counters["times_locate"] = left_out.count() / located.count();
}

BENCHMARK(leads_left_out)->UseManualTime()->Unit(benchmark::kMillisecond);
BENCHMARK(participant)->UseManualTime()->Unit(benchmark::kMillisecond);

}  // namespace
}  // namespace headwater
