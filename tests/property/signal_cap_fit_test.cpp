// SPDX-License-Identifier: GPL-3.0-or-later
// What a fit of a cap must give whatever the cap.
#include "cap_support.hpp"

#include <headwater/base/random.hpp>
#include <headwater/base/units.hpp>

#include <Eigen/Dense>
#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <numeric>

namespace headwater {
namespace {

Motion random_motion(RandomStream& random) {
  const Eigen::Vector3d axis = random.normal_matrix(3, 1);
  return {Eigen::AngleAxisd(2 * kPi * random.uniform(), axis.normalized()).toRotationMatrix(),
          0.1 * random.normal_matrix(3, 1)};
}

/// Names or landmarks: the motion back, the sphere and every position, to 1e-12.
void expect_recovered(DigitisedCap cap, const Motion& motion, const std::string& method) {
  const Eigen::Matrix3Xd truth = cap.electrodes.positions;
  move(cap, motion);
  const CapFit fit = fit_cap(cap);
  EXPECT_EQ(fit.method, method);
  EXPECT_LT((fit.rotation - motion.rotation.transpose()).cwiseAbs().maxCoeff(), 1e-12);
  EXPECT_LT((fit.montage.positions - truth).cwiseAbs().maxCoeff(), 1e-12);
  EXPECT_LT((fit.sphere.centre - motion.shift).norm(), 1e-12);
  EXPECT_NEAR(fit.sphere.radius, kCapRadius, 1e-12);
  EXPECT_TRUE(fit.outliers.empty());
  EXPECT_TRUE(fit.notes.empty() && !fit.mirrored && !fit.reversed);
}

TEST(SignalCapFit, RecoversARigidMotion) {
  RandomStream random(1, "cap motions");
  const Labels ten{"Fp1", "Fp2", "F7", "Fz", "F8", "C3", "Cz", "C4", "O1", "O2"};
  for (int draw = 0; draw < 20; ++draw) {
    const Motion motion = random_motion(random);
    for (const Labels& names : {ten, kSixtyFour, standard_names()}) {
      DigitisedCap cap = standard_cap(names);
      expect_recovered(cap, motion, "names");
      rename_all(cap);
      expect_recovered(cap, motion, "landmarks");
      cap = standard_cap(names);
      cap.nasion.reset();
      expect_recovered(cap, motion, "names");
    }
  }
}

// Where electrodes do not lie on a sphere its fit ends when the cost no longer falls in double
// precision: a step d changes the mean square rms^2 by about d^2, seen down to d = rms sqrt(eps),
// 0.05 * 1.5e-8 of the radius.
constexpr double kSphereEnds = 1e-9;

TEST(SignalCapFit, TheOrderOfElectrodesDoesNotMatter) {
  RandomStream random(2, "cap order");
  DigitisedCap cap = standard_cap(kSixtyFour);
  cap.electrodes.positions += 4e-3 * random.normal_matrix(3, cap.electrodes.positions.cols());
  cap.electrodes.positions.col(7) *= 1.5;
  const CapFit fit = fit_cap(cap);
  for (int draw = 0; draw < 10; ++draw) {
    std::vector<Eigen::Index> order(kSixtyFour.size());
    std::iota(order.begin(), order.end(), 0);
    std::sort(order.begin(), order.end(),
              [keys = random.normal_matrix(64, 1)](auto a, auto b) { return keys(a) < keys(b); });
    DigitisedCap other = cap;
    other.electrodes.positions = cap.electrodes.positions(Eigen::all, order).eval();
    for (std::size_t i = 0; i < order.size(); ++i)
      other.electrodes.labels[i] = kSixtyFour[static_cast<std::size_t>(order[i])];
    const CapFit again = fit_cap(other);
    EXPECT_LT((again.rotation - fit.rotation).norm(), kSphereEnds);
    EXPECT_LT((again.sphere.centre - fit.sphere.centre).norm(), kSphereEnds);
    ASSERT_EQ(again.outliers.size(), 1u);
    EXPECT_EQ(again.outliers[0].name, kSixtyFour[7]);
  }
}

TEST(SignalCapFit, LengthsScaleAndDirectionsDoNot) {
  DigitisedCap cap = standard_cap(kSixtyFour);
  RandomStream random(3, "cap scale");
  cap.electrodes.positions += 2e-3 * random.normal_matrix(3, 64);
  const CapFit fit = fit_cap(cap);
  cap.electrodes.positions *= 0.8;
  for (auto* landmark : {&cap.nasion, &cap.left_ear, &cap.right_ear}) **landmark *= 0.8;
  const CapFit small = fit_cap(cap);
  EXPECT_LT((small.rotation - fit.rotation).norm(), kSphereEnds);
  EXPECT_LT((small.montage.positions - 0.8 * fit.montage.positions).norm(), kSphereEnds);
  EXPECT_NEAR(small.landmark_angle_deg, fit.landmark_angle_deg, 1e-6);
}

Eigen::Matrix3d cross_matrix(const Eigen::Vector3d& v) {
  Eigen::Matrix3d m;
  m << 0, -v.z(), v.y(), v.z(), 0, -v.x(), -v.y(), v.x(), 0;
  return m;
}

/// Covariance of the small rotation phi left by isotropic noise of variance s^2 in each coordinate,
/// on a sphere of radius r. Directions err by e_i = P_i (n_i - c)/r, P_i = I - u_i u_i', with c the
/// error of the centre. Least squares gives phi = -A^-1 sum u_i x e_i, A = sum P_i, and u_i x
/// (P_i v) = u_i x v. The centre follows the radial noise alone (least squares on rows (u_i', 1)),
/// which is independent of the tangential noise, hence
///   cov phi = (s/r)^2 A^-1 (A + G K G') A^-1,   G = sum [u_i]x,
/// K the centre's block of the inverse normal matrix of the sphere fit.
Eigen::Matrix3d rotation_covariance(const Eigen::Matrix3Xd& u, double s_over_r) {
  const auto count = static_cast<double>(u.cols());
  const Eigen::Matrix3d a = count * Eigen::Matrix3d::Identity() - u * u.transpose();
  Eigen::MatrixX4d rows(u.cols(), 4);
  rows << u.transpose(), Eigen::VectorXd::Ones(u.cols());
  const Eigen::Matrix4d normal = rows.transpose() * rows;
  const Eigen::Matrix3d k = normal.inverse().topLeftCorner<3, 3>();
  const Eigen::Matrix3d g = cross_matrix(u.rowwise().sum());
  return s_over_r * s_over_r * a.inverse() * (a + g * k * g.transpose()) * a.inverse();
}

// phi' cov^-1 phi is chi-square with 3 degrees of freedom: over n draws its mean is 3 with standard
// deviation sqrt(6/n); allowed 4 of these and the second order of noise, (s/r)^2 times a few.
TEST(SignalCapFit, NoiseTurnsTheCapAsMuchAsTheoryTells) {
  RandomStream random(4, "cap noise");
  const double noise = 3e-3;
  const int draws = 1500;
  const DigitisedCap truth = standard_cap(kSixtyFour);
  const Eigen::Matrix3Xd u = truth.electrodes.positions / kCapRadius;
  const Eigen::Matrix3d precision = rotation_covariance(u, noise / kCapRadius).inverse();
  double sum = 0;
  for (int draw = 0; draw < draws; ++draw) {
    DigitisedCap cap = truth;
    cap.electrodes.positions += noise * random.normal_matrix(3, u.cols());
    const Eigen::AngleAxisd left(fit_cap(cap).rotation);
    const Eigen::Vector3d phi = left.angle() * left.axis();
    sum += phi.dot(precision * phi);
  }
  const double second_order = 10 * 3 * noise * noise / (kCapRadius * kCapRadius);
  EXPECT_NEAR(sum / draws, 3, 4 * std::sqrt(6.0 / draws) + second_order);
}

}  // namespace
}  // namespace headwater
