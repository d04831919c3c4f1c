// SPDX-License-Identifier: GPL-3.0-or-later
// The four inverses against the formulas as printed (src/reference/inverses), on a small case with
// noise that is far from spherical.
#include "inverse_support.hpp"
#include "reference/inverses.hpp"

#include <headwater/inverse/eloreta.hpp>
#include <headwater/inverse/estimate.hpp>
#include <headwater/inverse/lcmv.hpp>
#include <headwater/inverse/minimum_norm.hpp>
#include <headwater/inverse/sloreta.hpp>

#include <Eigen/Eigenvalues>
#include <Eigen/LU>
#include <Eigen/SVD>
#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

using Eigen::MatrixXd;

constexpr double kNoiseScale = 0.01;  // a contrast of 100 effective trials

/// The case thinned to every seventh point, for formulas that work on 3N by 3N matrices.
struct ThinCase {
  Subspace subspace;
  Eigen::Matrix3Xd outward;
  std::vector<Eigen::Index> mirror;
  ThinCase() {
    const InverseCase& whole = coarse_case();
    std::vector<Eigen::Index> kept, place(static_cast<std::size_t>(whole.grid.size()), -1);
    for (Eigen::Index p = 0; p < whole.grid.size(); ++p) {
      const Eigen::Index q = whole.grid.mirror[static_cast<std::size_t>(p)];
      if (std::min(p, q) % 7 != 0) continue;
      place[static_cast<std::size_t>(p)] = static_cast<Eigen::Index>(kept.size());
      kept.push_back(p);
    }
    MatrixXd gain(whole.channels(), static_cast<Eigen::Index>(3 * kept.size()));
    outward.resize(3, static_cast<Eigen::Index>(kept.size()));
    for (std::size_t i = 0; i < kept.size(); ++i) {
      const auto column = static_cast<Eigen::Index>(i);
      gain.middleCols<3>(3 * column) = whole.gain.middleCols<3>(3 * kept[i]);
      outward.col(column) = whole.outward.col(kept[i]);
      const auto image =
          static_cast<std::size_t>(whole.grid.mirror[static_cast<std::size_t>(kept[i])]);
      mirror.push_back(place[image]);
    }
    subspace = make_subspace(whole.labels, gain, whole.subspace.noise_V2);
  }
};

const ThinCase& thin() {
  static const ThinCase shared;
  return shared;
}

MatrixXd full(const SourceOperator& inverse) {
  return inverse.kernel.transpose() * inverse.map;
}

/// Largest deviation, relative to the largest entry of the rows of the same point.
double deviation(const MatrixXd& a, const MatrixXd& b) {
  double worst = 0;
  for (Eigen::Index row = 0; row < a.rows(); row += 3)
    worst = std::max(worst, (a - b).middleRows<3>(row).cwiseAbs().maxCoeff() /
                                b.middleRows<3>(row).cwiseAbs().maxCoeff());
  return worst;
}

// Tolerances: the condition of K R K' + lambda C, at most 1e7 for the smallest lambda, times 1e-16
// and the 30 terms of a row.
TEST(Inverses, MinimumNormIsTheFormula) {
  const Subspace& s = thin().subspace;
  for (const double p : {0.0, 0.8, 2.0}) {
    const MinimumNorm inverse(s, p);
    const double largest = inverse.spectrum().values.maxCoeff();
    for (const double relative : {1e-6, 1e-3, 1.0, 1e3}) {
      const double lambda = relative * largest / kNoiseScale;
      EXPECT_LE(deviation(full(inverse.at(lambda, kNoiseScale)),
                          reference::minimum_norm(s.gain, kNoiseScale * s.noise_V2, lambda, p) *
                              s.basis.transpose()),
                1e-8)
          << "p " << p << ", lambda " << relative;
    }
  }
}

TEST(Inverses, SloretaIsTheFormula) {
  const Subspace& s = thin().subspace;
  const Sloreta inverse(s);
  const double largest = inverse.spectrum().values.maxCoeff();
  for (const double relative : {1e-6, 1e-3, 1.0, 1e3}) {
    const double lambda = relative * largest / kNoiseScale;
    EXPECT_LE(deviation(full(inverse.at(lambda, kNoiseScale)),
                        reference::sloreta(s.gain, kNoiseScale * s.noise_V2, lambda) *
                            s.basis.transpose()),
              1e-7)
        << relative;
  }
}

TEST(Inverses, EloretaIsTheFormula) {
  const Subspace& s = thin().subspace;
  EloretaOptions options;
  options.tolerance = 1e-13;
  Eloreta inverse(s, options);
  for (const double relative : {1e-4, 1e-2, 1.0}) {
    const double lambda = relative * inverse.spectrum().values.maxCoeff() / kNoiseScale;
    const MatrixXd found = full(inverse.at(lambda, kNoiseScale));
    EXPECT_TRUE(inverse.converged()) << relative;
    EXPECT_LE(deviation(found, reference::eloreta(s.gain, kNoiseScale * s.noise_V2, lambda,
                                                  inverse.iterations()) *
                                   s.basis.transpose()),
              1e-8)
        << relative;
  }
}

/// A data covariance with two strong sources over the noise.
MatrixXd data_covariance(const Subspace& s) {
  const Eigen::VectorXd a = s.gain.middleCols<3>(3 * 10) * Eigen::Vector3d(20e-9, 5e-9, -10e-9);
  const Eigen::VectorXd b = s.gain.middleCols<3>(3 * 40) * Eigen::Vector3d(-5e-9, 15e-9, 9e-9);
  return kNoiseScale * s.noise_V2 + a * a.transpose() + b * b.transpose() +
         0.3 * (a * b.transpose() + b * a.transpose());
}

MatrixXd regularised(const MatrixXd& covariance, double share) {
  MatrixXd d = covariance;
  d.diagonal().array() += share * covariance.trace() / static_cast<double>(covariance.rows());
  return d;
}

TEST(Inverses, LcmvVectorOutputsAreTheFormulas) {
  const Subspace& s = thin().subspace;
  const MatrixXd cd = data_covariance(s), c = kNoiseScale * s.noise_V2;
  for (const bool paired : {false, true}) {
    LcmvOptions options;
    options.orientation = LcmvOptions::Orientation::vector;
    options.mirror_paired = paired;
    const auto make = [&](LcmvOptions::Output output) {
      options.output = output;
      return full(Lcmv(s, cd, thin().outward, thin().mirror, options).at(kNoiseScale));
    };
    const MatrixXd unit = reference::lcmv_unit_gain(s.gain, regularised(cd, options.regularisation),
                                                    paired ? &thin().mirror : nullptr);
    EXPECT_LE(deviation(make(LcmvOptions::Output::unit_gain), unit * s.basis.transpose()), 1e-8);
    MatrixXd by_noise = unit, index = unit;
    for (Eigen::Index l = 0; l < s.points(); ++l) {
      const MatrixXd w = unit.middleRows<3>(3 * l);
      const Eigen::Matrix3d noise = w * c * w.transpose();
      by_noise.middleRows<3>(3 * l) =
          Eigen::SelfAdjointEigenSolver<Eigen::Matrix3d>(noise).operatorInverseSqrt() * w;
      const MatrixXd k = s.gain.middleCols<3>(3 * l);
      index.middleRows<3>(3 * l) /= std::sqrt((k.transpose() * c.inverse() * k).inverse().trace());
    }
    EXPECT_LE(deviation(make(LcmvOptions::Output::unit_noise_gain), by_noise * s.basis.transpose()),
              1e-7);
    EXPECT_LE(deviation(make(LcmvOptions::Output::activity_index), index * s.basis.transpose()),
              1e-8);
  }
}

// The direction of maximum power, by brute force over the sphere: no direction gives the filter of
// that direction more power (unit gain) or power over noise (unit noise gain).
TEST(Inverses, LcmvFindsTheStrongestDirection) {
  const Subspace& s = thin().subspace;
  const MatrixXd cd = data_covariance(s), c = kNoiseScale * s.noise_V2;
  const MatrixXd d = regularised(cd, LcmvOptions{}.regularisation);
  for (const auto output : {LcmvOptions::Output::unit_gain, LcmvOptions::Output::unit_noise_gain}) {
    LcmvOptions options;
    options.output = output;
    const SourceOperator inverse =
        Lcmv(s, cd, thin().outward, thin().mirror, options).at(kNoiseScale);
    const MatrixXd on_y = inverse.kernel.transpose() * inverse.map * s.basis;  // 3N by M-1
    const bool by_noise = output != LcmvOptions::Output::unit_gain;
    const auto strength = [&](const Eigen::RowVectorXd& w) {
      return w.dot(w * d) / (by_noise ? w.dot(w * c) : 1);
    };
    for (Eigen::Index l = 0; l < s.points(); l += 9) {
      const MatrixXd block = on_y.middleRows<3>(3 * l);
      const Eigen::JacobiSVD<MatrixXd> svd(block, Eigen::ComputeThinU);
      EXPECT_LE(svd.singularValues()[1], 1e-10 * svd.singularValues()[0]);  // one direction only
      Eigen::Vector3d q = svd.matrixU().col(0);
      if (q.dot(thin().outward.col(l)) < 0) q = -q;
      const Eigen::RowVectorXd filter = reference::lcmv_along(s.gain, d, l, q);
      const double norm = by_noise ? std::sqrt(filter.dot(filter * c)) : 1;
      EXPECT_LE((block - q * filter / norm).cwiseAbs().maxCoeff(),
                1e-8 * block.cwiseAbs().maxCoeff());
      for (int i = 0; i < 400; ++i) {
        const double z = (i + 0.5) / 400, phi = 2.399963 * i;
        const Eigen::Vector3d other(std::sqrt(1 - z * z) * std::cos(phi),
                                    std::sqrt(1 - z * z) * std::sin(phi), z);
        EXPECT_LE(strength(reference::lcmv_along(s.gain, d, l, other)),
                  strength(filter) * (1 + 1e-9));
      }
    }
  }
}

}  // namespace
}  // namespace headwater
