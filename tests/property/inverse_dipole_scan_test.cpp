// SPDX-License-Identifier: GPL-3.0-or-later
#include "inverse_support.hpp"

#include <headwater/inverse/dipole_scan.hpp>
#include <headwater/inverse/estimate.hpp>
#include <headwater/inverse/lcmv.hpp>
#include <headwater/inverse/minimum_norm.hpp>
#include <headwater/inverse/peaks.hpp>
#include <headwater/inverse/sloreta.hpp>

#include <Eigen/QR>
#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

using Eigen::MatrixXd;
using Eigen::Vector3d;

Eigen::Index mirror_of(const InverseCase& c, Eigen::Index point) {
  return c.grid.mirror[static_cast<std::size_t>(point)];
}

TEST(DipoleScan, FindsEveryPlantedDipole) {
  const InverseCase& c = coarse_case();
  const DipoleScan scan(c.subspace, c.grid);
  const Vector3d moment(12e-9, -5e-9, 20e-9);
  for (Eigen::Index p = 0; p < c.grid.size(); p += 5) {
    Eigen::VectorXd map = c.map_of(p, moment);
    map.array() += 3e-6;  // any reference
    const DipoleVerdict verdict = scan.judge(map);
    EXPECT_EQ(verdict.one.point, p);
    EXPECT_LE(verdict.one.unexplained, 1e-13);
    EXPECT_LE((verdict.one.moment_Am - moment).norm(), 1e-9 * moment.norm());
    EXPECT_EQ(verdict.one.partner, -1);
    EXPECT_FALSE(verdict.pair_preferred);
  }
}

TEST(DipoleScan, FindsEveryPlantedPair) {
  const InverseCase& c = coarse_case();
  const DipoleScan scan(c.subspace, c.grid);
  const Vector3d right(-5e-9, 6e-9, 20e-9), left(7e-9, 3e-9, 15e-9);
  int pairs = 0;
  for (Eigen::Index p = 0; p < c.grid.size(); ++p) {
    if (c.grid.mni_m(0, p) < 20e-3 - 1e-9 || p % 3 != 0) continue;
    ++pairs;
    const DipoleVerdict verdict = scan.judge(c.map_of(p, right) + c.map_of(mirror_of(c, p), left));
    EXPECT_EQ(verdict.pair.point, p);
    EXPECT_EQ(verdict.pair.partner, mirror_of(c, p));
    EXPECT_LE(verdict.pair.unexplained, 1e-13);
    EXPECT_LE((verdict.pair.moment_Am - right).norm(), 1e-7 * right.norm());
    EXPECT_LE((verdict.pair.partner_moment_Am - left).norm(), 1e-7 * left.norm());
    EXPECT_TRUE(verdict.pair_preferred);
  }
  EXPECT_GT(pairs, 50);
}

// A second half of less than a third of the first's moment is no second generator, however well it
// explains the map.
TEST(DipoleScan, APairMustBeBalanced) {
  const InverseCase& c = coarse_case();
  const DipoleScan scan(c.subspace, c.grid);
  const Eigen::Index right = c.nearest(50, -20, 8);
  const Vector3d moment(-4e-9, 8e-9, 20e-9);
  for (const double share : {0.2, 0.3, 0.37, 0.8}) {
    for (const bool weaker_left : {true, false}) {
      const Eigen::VectorXd map = c.map_of(right, moment * (weaker_left ? 1 : share)) +
                                  c.map_of(mirror_of(c, right), moment * (weaker_left ? share : 1));
      const DipoleVerdict verdict = scan.judge(map);
      EXPECT_EQ(verdict.pair.point, right);
      EXPECT_EQ(verdict.pair_preferred, share > 1.0 / 3) << share;
    }
  }
}

// The unexplained share is that of a least-squares fit at the point; no other point does better.
TEST(DipoleScan, UnexplainedIsTheBestLeastSquaresFit) {
  const InverseCase& c = coarse_case();
  const DipoleScan scan(c.subspace, c.grid);
  RandomStream random(1, "scan");
  const Eigen::VectorXd map = c.map_of(100, {1e-8, 1e-8, 1e-8}) + 0.1 * c.noise_maps(random, 1);
  const Eigen::VectorXd y = c.subspace.basis.transpose() * map;
  const DipoleVerdict verdict = scan.judge(map);
  double least_one = 1, least_pair = 1;
  for (Eigen::Index p = 0; p < c.grid.size(); ++p) {
    const MatrixXd one = c.subspace.gain.middleCols<3>(3 * p);
    const auto share = [&](const MatrixXd& columns) {
      return (y - columns * columns.colPivHouseholderQr().solve(y)).squaredNorm() / y.squaredNorm();
    };
    least_one = std::min(least_one, share(one));
    if (c.grid.mni_m(0, p) < 20e-3 - 1e-9) continue;
    MatrixXd both(y.size(), 6);
    both << one, c.subspace.gain.middleCols<3>(3 * mirror_of(c, p));
    least_pair = std::min(least_pair, share(both));
  }
  EXPECT_NEAR(verdict.one.unexplained, least_one, 1e-12);
  EXPECT_NEAR(verdict.pair.unexplained, least_pair, 1e-12);
  // BIC as printed (Schwarz 1978 Ann Stat 6:461).
  EXPECT_NEAR(verdict.one.criterion, 30 * std::log(least_one) + 6 * std::log(30.0), 1e-9);
  EXPECT_NEAR(verdict.pair.criterion, 30 * std::log(least_pair) + 9 * std::log(30.0), 1e-9);
}

// Noise of each electrode at a tenth of the response: the criterion takes the model that made the
// data.
TEST(DipoleScan, PrefersTheModelThatMadeTheData) {
  const InverseCase& c = coarse_case();
  const DipoleScan scan(c.subspace, c.grid);
  RandomStream random(2, "preference");
  const Eigen::Index right = c.nearest(50, -20, 8);
  const Eigen::VectorXd one = c.map_of(right, {-4e-9, 8e-9, 20e-9});
  const Eigen::VectorXd pair = one + c.map_of(mirror_of(c, right), {4e-9, 8e-9, 18e-9});
  int one_right = 0, pair_right = 0, place_right = 0;
  constexpr int kDraws = 100;
  for (int draw = 0; draw < kDraws; ++draw) {
    const Eigen::VectorXd noise = random.normal_matrix(c.channels(), 1);
    const double size = 0.1 / std::sqrt(static_cast<double>(c.channels()));
    one_right += !scan.judge(one + size * one.norm() * noise).pair_preferred;
    const DipoleVerdict verdict = scan.judge(pair + size * pair.norm() * noise);
    pair_right += verdict.pair_preferred;
    place_right += (c.grid.mni_m.col(verdict.pair.point) - c.grid.mni_m.col(right)).norm() < 17e-3;
  }
  EXPECT_GE(one_right, 80);
  EXPECT_GE(pair_right, 95);
  EXPECT_GE(place_right, 90);
}

/// Two symmetric sources in the supratemporal planes, the same course in both: what maps make of
/// them.
struct BilateralCase {
  // Noise that happens to resemble the sources lets a beamformer cancel them: with T samples about
  // (M-1)/T of their power.
  static constexpr Eigen::Index kSamples = 600;
  const InverseCase& c = coarse_case();
  Eigen::Index right = c.nearest(48, -24, 12), left = mirror_of(c, right);
  MatrixXd data, noise;
  BilateralCase() {
    RandomStream random(3, "bilateral");
    noise = 0.05 * c.noise_maps(random, kSamples);
    data = noise;
    const Eigen::VectorXd map =
        c.map_of(right, {-4e-9, 8e-9, 20e-9}) + c.map_of(left, {4e-9, 8e-9, 20e-9});
    for (Eigen::Index t = 0; t < kSamples; ++t)
      data.col(t) += map * std::sin(0.06 * static_cast<double>(t));
  }
  double amplitude_at(const SourceOperator& inverse, Eigen::Index point) const {
    const SourceEstimate estimate = estimate_sources(inverse, data);
    return window_map(estimate.amplitude, {0, kSamples})[point];
  }
  SourceOperator lcmv(bool paired) const {
    const MatrixXd y = c.subspace.basis.transpose() * data;
    return Lcmv(c.subspace, y * y.transpose() / static_cast<double>(kSamples), c.outward,
                c.grid.mirror,
                {LcmvOptions::Output::unit_gain, LcmvOptions::Orientation::vector, paired, 1e-3})
        .at(0.0025);
  }
};

TEST(DipoleScan, SmoothInversesMergeTheTwoSidesWhereThePairIsFound) {
  const BilateralCase b;
  const Sloreta inverse(b.c.subspace);
  const SourceOperator smooth = inverse.at(inverse.spectrum().values.mean() / 9 / 0.0025, 0.0025);
  const SourceEstimate estimate = estimate_sources(smooth, b.data);
  const Eigen::VectorXd map = window_map(estimate.amplitude, {0, BilateralCase::kSamples});
  Eigen::Index peak = 0;
  map.maxCoeff(&peak);
  EXPECT_TRUE(may_be_merged(b.c.grid, peak)) << b.c.grid.mni_m.col(peak).transpose() * 1e3;
  Eigen::VectorXd strongest = b.data.col(26);
  const DipoleVerdict verdict = DipoleScan(b.c.subspace, b.c.grid).judge(strongest);
  EXPECT_TRUE(verdict.pair_preferred);
  EXPECT_LE((b.c.grid.mni_m.col(verdict.pair.point) - b.c.grid.mni_m.col(b.right)).norm(), 17e-3);
}

// Source: correlated bilateral sources cancel one another in a beamformer's output (Van Veen et al.
// 1997 IEEE TBME 44:867; Dalal et al. 2006 IEEE TBME 53:1357); with both in the constraint they do
// not.
TEST(DipoleScan, PairedBeamformerRecoversWhatThePlainOneSuppresses) {
  const BilateralCase b;
  const double true_rms = std::sqrt((4. * 4 + 8. * 8 + 20. * 20) / 2) * 1e-9;
  for (const Eigen::Index point : {b.left, b.right}) {
    EXPECT_LE(b.amplitude_at(b.lcmv(false), point), 0.4 * true_rms);
    EXPECT_NEAR(b.amplitude_at(b.lcmv(true), point) / true_rms, 1, 0.15);
  }
}

TEST(Peaks, AreLocalMaximaLargestFirst) {
  const InverseCase& c = coarse_case();
  const auto neighbours = grid_neighbours(c.grid);
  const Eigen::Index a = c.nearest(50, -20, 8), b = c.nearest(-40, 30, 30);
  MatrixXd amplitude(c.grid.size(), 4);
  for (Eigen::Index p = 0; p < c.grid.size(); ++p) {
    const double to_a = (c.grid.mni_m.col(p) - c.grid.mni_m.col(a)).squaredNorm() / 4e-4;
    const double to_b = (c.grid.mni_m.col(p) - c.grid.mni_m.col(b)).squaredNorm() / 4e-4;
    for (int t = 0; t < 4; ++t)
      amplitude(p, t) =
          std::exp(-to_a) * (t == 2 ? 2 : 1) + 0.8 * std::exp(-to_b) * (t == 1 ? 2 : 1);
  }
  const Eigen::VectorXd times = Eigen::VectorXd::LinSpaced(4, 0.1, 0.13);
  const SampleRange samples{1, 3};
  const Eigen::VectorXd map = window_map(amplitude, samples);
  EXPECT_NEAR(map[a], std::sqrt((1 + 4 + 1) / 3.0), 1e-3);
  auto peaks = find_peaks(neighbours, map, amplitude, times, samples);
  ASSERT_EQ(peaks.size(), 2u);
  EXPECT_EQ(peaks[0].point, a);
  EXPECT_NEAR(peaks[0].latency_s, 0.12, 1e-12);
  EXPECT_EQ(peaks[1].point, b);
  EXPECT_NEAR(peaks[1].latency_s, 0.11, 1e-12);
  EXPECT_EQ(find_peaks(neighbours, map, amplitude, times, samples, {1, 0.5}).size(), 1u);
  EXPECT_EQ(find_peaks(neighbours, map, amplitude, times, samples, {5, 0.9}).size(), 1u);
  // A flat map has one peak at most, a map of zeros none.
  EXPECT_TRUE(find_peaks(neighbours, 0 * map, amplitude, times, samples).empty());
}

}  // namespace
}  // namespace headwater
