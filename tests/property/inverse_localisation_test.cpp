// SPDX-License-Identifier: GPL-3.0-or-later
// One noise-free source: sLORETA (Pascual-Marqui 2002 Methods Find Exp Clin Pharmacol 24D:5) and
// eLORETA (2007 arXiv:0710.3341) put the largest value exactly where it is, at every node,
// orientation and lambda, whatever the noise covariance. The minimum norm does not.
#include "inverse_support.hpp"

#include <headwater/inverse/eloreta.hpp>
#include <headwater/inverse/estimate.hpp>
#include <headwater/inverse/minimum_norm.hpp>
#include <headwater/inverse/sloreta.hpp>

#include <Eigen/Cholesky>
#include <Eigen/LU>
#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

constexpr double kNoiseScale = 0.01;

/// Nodes whose source, in any of four orientations, has its largest amplitude elsewhere.
Eigen::Index misplaced(const SourceOperator& inverse, const Eigen::MatrixXd& gain) {
  const Eigen::Index points = gain.cols() / 3;
  const Eigen::MatrixXd resolution = inverse.kernel.transpose() * (inverse.map * gain);
  Eigen::Matrix<double, 3, 4> moments;
  moments << 1, 0, 0, 0.3, 0, 1, 0, -0.8, 0, 0, 1, 0.52;
  Eigen::Index wrong = 0;
  for (Eigen::Index p = 0; p < points; ++p)
    for (int o = 0; o < 4; ++o) {
      const Eigen::VectorXd j = resolution.middleCols<3>(3 * p) * moments.col(o);
      Eigen::Index peak = 0;
      Eigen::Map<const Eigen::Matrix3Xd>(j.data(), 3, points)
          .colwise()
          .squaredNorm()
          .maxCoeff(&peak);
      wrong += peak != p;
    }
  return wrong;
}

TEST(Localisation, SloretaIsExactEverywhere) {
  const InverseCase& c = coarse_case();
  const Sloreta inverse(c.subspace);
  const double largest = inverse.spectrum().values.maxCoeff();
  for (const double relative : {1e-8, 1e-4, 1e-1, 1e3, 1e8})
    EXPECT_EQ(misplaced(inverse.at(relative * largest / kNoiseScale, kNoiseScale), c.gain), 0)
        << "lambda " << relative;
}

TEST(Localisation, EloretaIsExactEverywhere) {
  const InverseCase& c = coarse_case();
  Eloreta inverse(c.subspace);
  const double largest = inverse.spectrum().values.maxCoeff();
  for (const double relative : {1e-6, 1e-3, 1e-1, 1e3}) {
    const SourceOperator op = inverse.at(relative * largest / kNoiseScale, kNoiseScale);
    EXPECT_TRUE(inverse.converged()) << "lambda " << relative;
    EXPECT_EQ(misplaced(op, c.gain), 0) << "lambda " << relative;
  }
}

// Were the test above blind, this would pass it too.
TEST(Localisation, MinimumNormIsNot) {
  const InverseCase& c = coarse_case();
  for (const double p : {0.0, 0.8}) {
    const MinimumNorm inverse(c.subspace, p);
    const double lambda = 1e-2 * inverse.spectrum().values.maxCoeff() / kNoiseScale;
    EXPECT_GT(misplaced(inverse.at(lambda, kNoiseScale), c.gain), c.grid.size() / 4) << "p " << p;
  }
}

// At the fixed point the diagonal blocks of the resolution matrix are the weights themselves:
// R_ll = W_l^-1 K_l' M K_l = W_l. So W can be read from the operator and put into the equation,
// with the noise as it is, not whitened.
TEST(Localisation, EloretaSolvesItsEquation) {
  const InverseCase& c = coarse_case();
  EloretaOptions options;
  options.tolerance = 1e-13;
  options.most_iterations = 400;
  Eloreta inverse(c.subspace, options);
  const Eigen::MatrixXd& k = c.subspace.gain;
  for (const double relative : {1e-3, 1e-1}) {
    const double lambda = relative * inverse.spectrum().values.maxCoeff() / kNoiseScale;
    const SourceOperator op = inverse.at(lambda, kNoiseScale);
    ASSERT_TRUE(inverse.converged()) << inverse.iterations();
    const Eigen::MatrixXd mapped = op.map * c.gain;
    Eigen::MatrixXd weighted(k.rows(), k.cols());
    std::vector<Eigen::Matrix3d> weight;
    for (Eigen::Index l = 0; l < c.grid.size(); ++l) {
      weight.push_back(op.kernel.middleCols<3>(3 * l).transpose() * mapped.middleCols<3>(3 * l));
      EXPECT_LE((weight.back() - weight.back().transpose()).norm(), 1e-10 * weight.back().norm());
      weighted.middleCols<3>(3 * l) = k.middleCols<3>(3 * l) * weight.back().inverse();
    }
    const Eigen::MatrixXd m = weighted * k.transpose() + lambda * kNoiseScale * c.subspace.noise_V2;
    const Eigen::MatrixXd solved = m.ldlt().solve(k);
    double worst = 0;
    for (Eigen::Index l = 0; l < c.grid.size(); ++l) {
      const Eigen::Matrix3d square =
          k.middleCols<3>(3 * l).transpose() * solved.middleCols<3>(3 * l);
      const Eigen::Matrix3d& w = weight[static_cast<std::size_t>(l)];
      worst = std::max(worst, (square - w * w).norm() / square.norm());
    }
    EXPECT_LE(worst, 1e-10) << "lambda " << relative;
  }
}

// trace(R) = sum d/(d + alpha) is at most M-1 where the estimator is a shrunken projection.
TEST(Localisation, TraceOfTheResolutionIsBounded) {
  const InverseCase& c = coarse_case();
  const double most = static_cast<double>(c.channels() - 1);
  const MinimumNorm inverse(c.subspace, 0.8);
  const Eigen::ArrayXd d = inverse.spectrum().values;
  double before = most;
  for (const double relative : {1e-9, 1e-4, 1e-2, 1.0, 1e4}) {
    const double lambda = relative * d.maxCoeff() / kNoiseScale;
    const double trace = resolution_trace(inverse.at(lambda, kNoiseScale), c.gain);
    EXPECT_NEAR(trace, (d / (d + lambda * kNoiseScale)).sum(), 1e-8 * most);
    EXPECT_LE(trace, before);
    before = trace;
  }
  Eloreta exact(c.subspace);
  const double lambda = 1e-3 * exact.spectrum().values.maxCoeff() / kNoiseScale;
  EXPECT_LE(resolution_trace(exact.at(lambda, kNoiseScale), c.gain), most);
}

}  // namespace
}  // namespace headwater
