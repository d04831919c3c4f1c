// SPDX-License-Identifier: GPL-3.0-or-later
// What must not change a source map: the reference of data and lead field, the order of the
// channels, the unit of the volts, whether a contrast's noise is given by its scale or as its own
// covariance. And a mirrored scalp map gives the mirrored source map.
#include "inverse_support.hpp"

#include <headwater/inverse/eloreta.hpp>
#include <headwater/inverse/estimate.hpp>
#include <headwater/inverse/lcmv.hpp>
#include <headwater/inverse/minimum_norm.hpp>
#include <headwater/inverse/regularisation.hpp>
#include <headwater/inverse/sloreta.hpp>

#include <gtest/gtest.h>

#include <cmath>
#include <functional>
#include <numeric>

namespace headwater {
namespace {

using Eigen::MatrixXd;

constexpr double kNoiseScale = 0.01;

/// Forty samples of two sources and noise: M by T, V.
MatrixXd example_data(const InverseCase& c) {
  RandomStream random(1, "invariance");
  MatrixXd data = 0.1 * c.noise_maps(random, 40);
  const Eigen::VectorXd a = c.map_of(c.nearest(50, -22, 8), {5e-9, 10e-9, 30e-9});
  const Eigen::VectorXd b = c.map_of(c.nearest(-30, 40, 30), {-10e-9, 5e-9, 8e-9});
  for (int t = 0; t < 40; ++t) data.col(t) += a * std::sin(0.08 * t) + b * std::sin(0.13 * t + 0.4);
  return data;
}

/// lambda by generalised cross-validation, as a user gets it.
double gcv_lambda(const Subspace& s, const GramSpectrum& spectrum, const MatrixXd& data,
                  double scale) {
  const MatrixXd z = spectrum_map(s, spectrum) * data / std::sqrt(scale);
  return choose_regularisation(spectrum.values / scale, z, {}).used;
}

struct Method {
  const char* name;
  std::function<SourceOperator(const Subspace&, const MatrixXd& data, double scale)> make;
  bool in_volts;  // the estimate follows the unit of the data
};

std::vector<Method> methods(const InverseCase& c) {
  const auto lcmv = [&c](LcmvOptions options) {
    return [&c, options](const Subspace& s, const MatrixXd& data, double scale) {
      const MatrixXd y = s.basis.transpose() * data;
      return Lcmv(s, y * y.transpose() / static_cast<double>(y.cols()), c.outward, c.grid.mirror,
                  options)
          .at(scale);
    };
  };
  using Output = LcmvOptions::Output;
  using Orientation = LcmvOptions::Orientation;
  return {
      {"minimum norm",
       [](const Subspace& s, const MatrixXd& data, double scale) {
         const MinimumNorm inverse(s, 0.8);
         return inverse.at(gcv_lambda(s, inverse.spectrum(), data, scale), scale);
       },
       true},
      {"sloreta",
       [](const Subspace& s, const MatrixXd& data, double scale) {
         const Sloreta inverse(s);
         return inverse.at(gcv_lambda(s, inverse.spectrum(), data, scale), scale);
       },
       true},
      {"eloreta",
       [](const Subspace& s, const MatrixXd& data, double scale) {
         EloretaOptions options;
         options.tolerance = 1e-12;
         Eloreta inverse(s, options);
         return inverse.at(gcv_lambda(s, inverse.spectrum(), data, scale), scale);
       },
       true},
      {"lcmv unit gain", lcmv({Output::unit_gain, Orientation::vector, false, 0.05}), true},
      {"lcmv noise gain", lcmv({Output::unit_noise_gain, Orientation::maximum_power, false, 0.05}),
       false},
      {"lcmv index, paired", lcmv({Output::activity_index, Orientation::maximum_power, true, 0.05}),
       false},
  };
}

MatrixXd estimate(const Method& method, const Subspace& s, const MatrixXd& data, double scale) {
  return estimate_sources(method.make(s, data, scale), data).components;
}

// 1e-6: the golden section of the cross-validation ends at 1e-7 of lambda, where a flat minimum
// lets rounding decide.
void expect_same(const MatrixXd& found, const MatrixXd& expected, const std::string& what) {
  EXPECT_LE((found - expected).cwiseAbs().maxCoeff(), 1e-6 * expected.cwiseAbs().maxCoeff())
      << what;
}

TEST(InverseInvariance, Reference) {
  const InverseCase& c = coarse_case();
  const MatrixXd data = example_data(c);
  MatrixXd drifting = data;  // a common signal, a hundred times the response
  for (Eigen::Index t = 0; t < data.cols(); ++t)
    drifting.col(t).array() += 1e-4 * std::cos(0.3 * static_cast<double>(t));
  const MatrixXd ears = channel_reference(c.labels, {"T7", "P8"});
  const Subspace other = make_subspace(c.labels, ears * c.gain, c.subspace.noise_V2);
  for (const auto& method : methods(c)) {
    const MatrixXd expected = estimate(method, c.subspace, data, kNoiseScale);
    expect_same(estimate(method, c.subspace, drifting, kNoiseScale), expected, method.name);
    expect_same(estimate(method, other, ears * data, kNoiseScale), expected, method.name);
  }
}

TEST(InverseInvariance, ChannelOrder) {
  const InverseCase& c = coarse_case();
  const MatrixXd data = example_data(c);
  Eigen::PermutationMatrix<Eigen::Dynamic> order(c.channels());
  order.setIdentity();
  for (Eigen::Index m = 0; m < c.channels(); ++m)
    order.indices()[m] = static_cast<int>((m * 12 + 5) % c.channels());  // 31 is prime
  Labels labels(c.labels.size());
  for (std::size_t m = 0; m < labels.size(); ++m)
    labels[static_cast<std::size_t>(order.indices()[static_cast<Eigen::Index>(m)])] = c.labels[m];
  const MatrixXd noise = order * c.sensor_noise * order.transpose();
  const Subspace other = make_subspace(labels, order * c.gain, c.subspace_noise(noise));
  for (const auto& method : methods(c))
    expect_same(estimate(method, other, order * data, kNoiseScale),
                estimate(method, c.subspace, data, kNoiseScale), method.name);
}

TEST(InverseInvariance, UnitOfTheData) {
  const InverseCase& c = coarse_case();
  const MatrixXd data = example_data(c);
  for (const double unit : {1e-8, 1e6, 1e8}) {
    const Subspace other = make_subspace(c.labels, c.gain, unit * unit * c.subspace.noise_V2);
    for (const auto& method : methods(c)) {
      const double follows = method.in_volts ? unit : 1;
      expect_same(estimate(method, other, unit * data, kNoiseScale) / follows,
                  estimate(method, c.subspace, data, kNoiseScale),
                  std::string(method.name) + ", " + std::to_string(unit));
    }
  }
}

TEST(InverseInvariance, ScaleOrCovarianceOfTheContrast) {
  const InverseCase& c = coarse_case();
  const MatrixXd data = example_data(c);
  const Subspace own = make_subspace(c.labels, c.gain, kNoiseScale * c.subspace.noise_V2);
  EXPECT_NEAR(noise_scale(c.subspace, own.noise_V2), kNoiseScale, 1e-15);
  EXPECT_EQ(noise_scale(c.subspace, MatrixXd::Identity(30, 30)), 0);
  for (const auto& method : methods(c))
    expect_same(estimate(method, c.subspace, data, kNoiseScale), estimate(method, own, data, 1),
                method.name);
}

TEST(InverseInvariance, MirrorOfTheHead) {
  const InverseCase& c = coarse_case();
  const MatrixXd data = example_data(c);
  for (const auto& method : methods(c)) {
    const MatrixXd map = estimate(method, c.subspace, data, kNoiseScale);
    const MatrixXd image = estimate(method, c.subspace, c.mirrored_data(data), kNoiseScale);
    MatrixXd expected(map.rows(), map.cols());
    for (Eigen::Index p = 0; p < c.grid.size(); ++p) {
      const Eigen::Index q = c.grid.mirror[static_cast<std::size_t>(p)];
      expected.middleRows<3>(3 * q) = map.middleRows<3>(3 * p);
      expected.row(3 * q) = -map.row(3 * p);
    }
    // A direction that lies along the head's surface has no outward side; compare lengths there.
    const auto lengths = [](const MatrixXd& j) {
      return Eigen::Map<const Eigen::Matrix3Xd>(j.data(), 3, j.size() / 3).colwise().norm().eval();
    };
    expect_same(lengths(image), lengths(expected), method.name);
    if (method.in_volts) expect_same(image, expected, method.name);
  }
}

// The fit that is reported, from the spectrum, is that of the estimate: y - K J in sensor space.
TEST(InverseInvariance, FitIsThatOfTheEstimate) {
  const InverseCase& c = coarse_case();
  const MatrixXd data = example_data(c), y = c.subspace.basis.transpose() * data;
  const auto explained = [&](const SourceOperator& inverse) {
    const MatrixXd j = estimate_sources(inverse, data).components;
    return 1 - (y - c.subspace.gain * j).squaredNorm() / y.squaredNorm();
  };
  const auto stated = [&](const GramSpectrum& spectrum, double lambda) {
    const MatrixXd z = spectrum_map(c.subspace, spectrum) * data;
    return ridge_fit(c.subspace, spectrum, z, lambda * kNoiseScale, kNoiseScale).explained_variance;
  };
  const MinimumNorm plain(c.subspace, 0.8);
  const double lambda = gcv_lambda(c.subspace, plain.spectrum(), data, kNoiseScale);
  EXPECT_NEAR(stated(plain.spectrum(), lambda), explained(plain.at(lambda, kNoiseScale)), 1e-8);
  // eLORETA's spectrum is that of the weights in use, once there are any.
  Eloreta exact(c.subspace);
  const SourceOperator inverse =
      exact.at(gcv_lambda(c.subspace, exact.spectrum(), data, kNoiseScale), kNoiseScale);
  EXPECT_NEAR(stated(exact.spectrum(), inverse.lambda), explained(inverse), 1e-8);
}

// The subspace itself: whitener, and refusal of what is no covariance.
TEST(InverseInvariance, SubspaceWhitens) {
  const InverseCase& c = coarse_case();
  const Subspace& s = c.subspace;
  EXPECT_LE((s.whitener * s.noise_V2 * s.whitener.transpose() - MatrixXd::Identity(30, 30))
                .cwiseAbs()
                .maxCoeff(),
            1e-12);
  EXPECT_LE((s.whitened_gain - s.whitener * s.gain).cwiseAbs().maxCoeff(),
            1e-12 * s.whitened_gain.cwiseAbs().maxCoeff());
  EXPECT_LE((s.basis.transpose() * Eigen::VectorXd::Ones(31)).cwiseAbs().maxCoeff(), 1e-14);
}

}  // namespace
}  // namespace headwater
