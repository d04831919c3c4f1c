// SPDX-License-Identifier: GPL-3.0-or-later
// By names. With B = sum_i w_i s_i u_i' = U S V' the matrix of determinant d = +-1 that minimises
// sum_i w_i |Q u_i - s_i|^2 is U diag(1, 1, d det U det V) V' (Kabsch 1976 Acta Cryst A32:922, 1978
// A34:827). Weights: first 1/angle (the sum of angles instead of squares, so that a few wrong
// labels do not decide; angles below a degree count as one), then 1 for all names within
// kMisplacedDeg and 0 beyond, until the set stays the same. Two labels exchanged do not pull even
// before: what they add to B is symmetric in the two.
//
// By landmarks. x along LPA to RPA; y and z across it, so that the nasion stands at the template's
// elevation seen from the sphere's centre. On the template head's surface (templates/README.md;
// landmarks placed by eye) the nasion is at MNI (0, 84, -42) mm, relative to the head's centre
// (0, 99.4, -39.2): elevation atan2(-39.2, 99.4) = -21.52 degrees.
#include "cap_rotation.hpp"

#include <headwater/base/units.hpp>

#include <Eigen/Dense>

#include <algorithm>
#include <cmath>

namespace headwater {
namespace {

constexpr double kDegree = kPi / 180;
constexpr int kMostRounds = 100;
const double kNasionElevation = std::atan2(-39.2, 99.4);

Eigen::Matrix3d kabsch(const Eigen::Matrix3Xd& from, const Eigen::Matrix3Xd& to,
                       const Eigen::VectorXd& weights, int chirality) {
  const Eigen::Matrix3d b = to * weights.asDiagonal() * from.transpose();
  const Eigen::JacobiSVD<Eigen::Matrix3d> svd(b, Eigen::ComputeFullU | Eigen::ComputeFullV);
  const double sign = chirality * svd.matrixU().determinant() * svd.matrixV().determinant();
  return svd.matrixU() * Eigen::Vector3d(1, 1, sign > 0 ? 1 : -1).asDiagonal() *
         svd.matrixV().transpose();
}

}  // namespace

Eigen::VectorXd angles_deg(const Eigen::Matrix3Xd& a, const Eigen::Matrix3Xd& b) {
  Eigen::VectorXd angles(a.cols());
  for (Eigen::Index i = 0; i < a.cols(); ++i)  // precise for small angles, unlike acos
    angles[i] =
        std::atan2(a.col(i).head<3>().cross(b.col(i).head<3>()).norm(), a.col(i).dot(b.col(i))) /
        kDegree;
  return angles;
}

double angle_between_deg(const Eigen::Matrix3d& a, const Eigen::Matrix3d& b) {
  // |A - B| (Frobenius) = 2 sqrt(2) sin(angle / 2)
  return 2 * std::asin(std::min(1.0, (a - b).norm() / std::sqrt(8.0))) / kDegree;
}

NamesRotation rotation_by_names(const Eigen::Matrix3Xd& directions,
                                const Eigen::Matrix3Xd& standard, int chirality) {
  Eigen::VectorXd weights = Eigen::VectorXd::Ones(directions.cols());
  NamesRotation found;
  const auto turn = [&] { found.rotation = kabsch(directions, standard, weights, chirality); };
  const auto angles = [&] { return angles_deg(found.rotation * directions, standard); };
  turn();
  for (int round = 0; round < kMostRounds; ++round) {
    const Eigen::Matrix3d before = found.rotation;
    weights = angles().cwiseMax(1).cwiseInverse();
    turn();
    if ((found.rotation - before).norm() < 1e-12) break;
  }
  for (int round = 0; round < kMostRounds; ++round) {
    const Eigen::VectorXd inside = (angles().array() <= kMisplacedDeg).cast<double>();
    if (inside.sum() < 4 || (round > 0 && inside == weights)) break;
    weights = inside;
    turn();
  }
  found.mean_angle_deg = angles().mean();
  return found;
}

Eigen::Matrix3d rotation_by_landmarks(const Eigen::Vector3d& nasion, const Eigen::Vector3d& ears) {
  const Eigen::Vector3d x = ears.normalized();
  const Eigen::Vector3d ahead = (nasion - x * x.dot(nasion)).normalized();
  const Eigen::Vector3d above = x.cross(ahead);
  const double c = std::cos(kNasionElevation), s = std::sin(kNasionElevation);
  Eigen::Matrix3d rotation;
  rotation.row(0) = x;
  rotation.row(1) = c * ahead - s * above;
  rotation.row(2) = s * ahead + c * above;
  return rotation;
}

std::optional<Eigen::Matrix3d> stated_axes(std::string_view letters) {
  constexpr std::string_view positive = "RAS", negative = "LPI";
  if (letters.size() != 3) return std::nullopt;
  Eigen::Matrix3d to_ras = Eigen::Matrix3d::Zero();
  for (std::size_t axis = 0; axis < 3; ++axis) {
    const std::size_t up = positive.find(letters[axis]), down = negative.find(letters[axis]);
    if (up == positive.npos && down == negative.npos) return std::nullopt;
    to_ras(static_cast<Eigen::Index>(std::min(up, down)), static_cast<Eigen::Index>(axis)) =
        up != positive.npos ? 1 : -1;
  }
  if (to_ras.determinant() == 0) return std::nullopt;
  return to_ras;
}

}  // namespace headwater
