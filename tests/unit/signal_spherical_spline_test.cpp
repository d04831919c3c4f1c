// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/error.hpp>
#include <headwater/signal/spherical_spline.hpp>

#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

/// Sites spread evenly over the sphere above z = -0.3 (golden-angle spiral).
Eigen::Matrix3Xd sites(int count) {
  Eigen::Matrix3Xd result(3, count);
  for (int i = 0; i < count; ++i) {
    const double z = 1 - 1.3 * (i + 0.5) / count, angle = 2.399963229728653 * i;
    const double across = std::sqrt(1 - z * z);
    result.col(i) << across * std::cos(angle), across * std::sin(angle), z;
  }
  return result;
}

Eigen::Matrix3Xd elsewhere() {
  Eigen::Matrix3Xd places(3, 4);
  places << 1, -1, 0.5, -0.7, 2, 0.2, -0.6, 0.2, 3, 0, 0.4, 0.5;
  return places;
}

// The solve of a system with condition below 1e7 at n = 60 leaves 1e-9 of the values.
TEST(SignalSphericalSpline, PassesThroughTheMeasuredValuesWhateverTheLengths) {
  const Eigen::Matrix3Xd e = sites(60);
  const Eigen::MatrixXd p = spline_interpolation(e * 0.092, 2 * e);
  EXPECT_LT((p - Eigen::MatrixXd::Identity(60, 60)).cwiseAbs().maxCoeff(), 1e-8);
}

TEST(SignalSphericalSpline, KeepsAConstant) {
  const Eigen::MatrixXd p = spline_interpolation(sites(20), elsewhere());
  EXPECT_LT((p.rowwise().sum().array() - 1).abs().maxCoeff(), 1e-9);
  EXPECT_LT((spline_prediction(sites(20)).rowwise().sum().array() - 1).abs().maxCoeff(), 1e-9);
}

// A field of low degree, measured densely, is found between the sites: 60 sites are 0.37 rad apart,
// and a spline of order 4 errs by about (0.37 k / pi)^4 of a degree-k term: 4e-3 for k = 2,
// doubled.
TEST(SignalSphericalSpline, FindsASmoothFieldBetweenTheSites) {
  const auto field = [](const Eigen::Vector3d& u) { return u.x() * u.z() + 0.5 * u.y(); };
  const Eigen::Matrix3Xd e = sites(60), to = elsewhere().rightCols(2).colwise().normalized();
  Eigen::VectorXd v(60);
  for (int i = 0; i < 60; ++i) v(i) = field(e.col(i));
  const Eigen::VectorXd found = spline_interpolation(e, to) * v;
  for (int i = 0; i < 2; ++i) EXPECT_NEAR(found(i), field(to.col(i)), 8e-3);
}

// The slow twin: leave each electrode out and interpolate there. The full system's condition below
// 1e7 leaves 1e-9.
TEST(SignalSphericalSpline, PredictsWhatInterpolationFromTheOthersGives) {
  for (const int count : {5, 19, 64}) {
    const Eigen::Matrix3Xd e = sites(count);
    const Eigen::MatrixXd prediction = spline_prediction(e);
    for (int i = 0; i < count; ++i) {
      Eigen::Matrix3Xd others(3, count - 1);
      others << e.leftCols(i), e.rightCols(count - 1 - i);
      const Eigen::MatrixXd p = spline_interpolation(others, e.col(i));
      Eigen::RowVectorXd expected(count);
      expected << p.leftCols(i), 0, p.rightCols(count - 1 - i);
      EXPECT_LT((prediction.row(i) - expected).cwiseAbs().maxCoeff(), 1e-8) << count << " " << i;
    }
  }
}

TEST(SignalSphericalSpline, RefusesTooFewAlikeAndCentralElectrodes) {
  Eigen::Matrix3Xd e = sites(12);
  EXPECT_THROW(spline_interpolation(e.leftCols(3), e), InputError);
  EXPECT_THROW(spline_prediction(e.leftCols(4)), InputError);
  e.col(7) = 3 * e.col(2);
  try {
    spline_interpolation(e, e);
    FAIL();
  } catch (const InputError& error) {
    EXPECT_NE(std::string(error.what()).find("electrodes 3 and 8"), std::string::npos);
  }
  e.col(7).setZero();
  EXPECT_THROW(spline_prediction(e), InputError);
}

}  // namespace
}  // namespace headwater
