// SPDX-License-Identifier: GPL-3.0-or-later
// Constraints that beamformer filters keep to rounding, whatever the data.
#include "inverse_support.hpp"

#include <headwater/inverse/estimate.hpp>
#include <headwater/inverse/lcmv.hpp>

#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

using Eigen::MatrixXd;
using Output = LcmvOptions::Output;
using Orientation = LcmvOptions::Orientation;

constexpr double kNoiseScale = 0.02;

MatrixXd data_covariance(const InverseCase& c) {
  const Eigen::VectorXd y =
      c.subspace.basis.transpose() * c.map_of(c.nearest(50, -20, 5), {5e-9, 5e-9, 30e-9});
  return kNoiseScale * c.subspace.noise_V2 + y * y.transpose();
}

MatrixXd operator_of(Output output, Orientation orientation, bool paired) {
  const InverseCase& c = coarse_case();
  const SourceOperator inverse = Lcmv(c.subspace, data_covariance(c), c.outward, c.grid.mirror,
                                      {output, orientation, paired, 0.05})
                                     .at(kNoiseScale);
  return inverse.kernel.transpose() * inverse.map;
}

TEST(Lcmv, UnitGainIsUnitGain) {
  const InverseCase& c = coarse_case();
  for (const bool paired : {false, true}) {
    const MatrixXd w = operator_of(Output::unit_gain, Orientation::vector, paired);
    for (Eigen::Index p = 0; p < c.grid.size(); ++p) {
      const Eigen::Matrix3d own = w.middleRows<3>(3 * p) * c.gain.middleCols<3>(3 * p);
      EXPECT_LE((own - Eigen::Matrix3d::Identity()).cwiseAbs().maxCoeff(), 1e-8) << p;
      const Eigen::Index image = c.grid.mirror[static_cast<std::size_t>(p)];
      if (!paired || image == p) continue;
      EXPECT_LE((w.middleRows<3>(3 * p) * c.gain.middleCols<3>(3 * image)).cwiseAbs().maxCoeff(),
                1e-7);
    }
  }
}

// Along its own direction q a filter of maximum power has unit gain, and its output lies along q.
TEST(Lcmv, MaximumPowerFilterHasUnitGainAlongItsDirection) {
  const InverseCase& c = coarse_case();
  for (const bool paired : {false, true}) {
    const MatrixXd w = operator_of(Output::unit_gain, Orientation::maximum_power, paired);
    for (Eigen::Index p = 0; p < c.grid.size(); ++p) {
      // W L_l = q w'L_l with w'L_l q = 1: a projection of rank one.
      const Eigen::Matrix3d own = w.middleRows<3>(3 * p) * c.gain.middleCols<3>(3 * p);
      EXPECT_NEAR(own.trace(), 1, 1e-8);
      EXPECT_LE((own * own - own).cwiseAbs().maxCoeff(), 1e-7 * own.squaredNorm());
    }
  }
}

TEST(Lcmv, UnitNoiseGainIsUnitNoiseGain) {
  const InverseCase& c = coarse_case();
  const MatrixXd noise = kNoiseScale * c.sensor_noise;
  for (const bool paired : {false, true}) {
    const MatrixXd vector = operator_of(Output::unit_noise_gain, Orientation::vector, paired);
    const MatrixXd along = operator_of(Output::unit_noise_gain, Orientation::maximum_power, paired);
    for (Eigen::Index p = 0; p < c.grid.size(); ++p) {
      const MatrixXd w = vector.middleRows<3>(3 * p), v = along.middleRows<3>(3 * p);
      EXPECT_LE((w * noise * w.transpose() - Eigen::Matrix3d::Identity()).cwiseAbs().maxCoeff(),
                1e-6);
      EXPECT_NEAR((v * noise * v.transpose()).trace(), 1, 1e-8);
    }
  }
}

// Pure noise gives an amplitude whose mean square is the number of directions.
TEST(Lcmv, NoiseAloneHasTheAmplitudeOfNoise) {
  const InverseCase& c = coarse_case();
  RandomStream random(1, "lcmv noise");
  const MatrixXd noise = std::sqrt(kNoiseScale) * c.noise_maps(random, 400);
  const auto mean_square = [&](Orientation orientation) {
    return (operator_of(Output::unit_noise_gain, orientation, false) * noise).squaredNorm() /
           static_cast<double>(400 * c.grid.size());
  };
  // 400 samples of chi-square, points far from independent: 5 standard errors are about 0.3 of one.
  EXPECT_NEAR(mean_square(Orientation::vector), 3, 0.9);
  EXPECT_NEAR(mean_square(Orientation::maximum_power), 1, 0.3);
}

// The strongest source of the data is where the map of maximum power is largest.
TEST(Lcmv, FindsTheSourceOfTheData) {
  const InverseCase& c = coarse_case();
  const Eigen::Index source = c.nearest(50, -20, 5);
  const Eigen::VectorXd map = c.map_of(source, {5e-9, 5e-9, 30e-9});
  for (const auto orientation : {Orientation::vector, Orientation::maximum_power}) {
    const MatrixXd j = operator_of(Output::unit_noise_gain, orientation, false) * map;
    Eigen::Index peak = 0;
    Eigen::Map<const Eigen::Matrix3Xd>(j.data(), 3, c.grid.size()).colwise().norm().maxCoeff(&peak);
    EXPECT_EQ(peak, source);
  }
}

TEST(Lcmv, PooledCovarianceIsTheMeanOverConditionsAndSamples) {
  RandomStream random(2, "pooled");
  std::vector<Average> averages(2);
  for (auto& average : averages) {
    average.times_s = Eigen::VectorXd::LinSpaced(21, -0.1, 0.1);
    average.data_V = 1e-6 * random.normal_matrix(8, 21);
  }
  const MatrixXd basis = reference_free_basis(8);
  MatrixXd expected = MatrixXd::Zero(7, 7);
  for (const auto& average : averages)
    for (int t = 10; t <= 20; ++t) {  // 0 to 100 ms, both ends
      const Eigen::VectorXd y = basis.transpose() * average.data_V.col(t);
      expected += y * y.transpose() / 22;
    }
  EXPECT_LE((pooled_data_covariance(averages, 0, 0.1) - expected).cwiseAbs().maxCoeff(), 1e-24);
}

}  // namespace
}  // namespace headwater
