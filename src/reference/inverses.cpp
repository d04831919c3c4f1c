// SPDX-License-Identifier: GPL-3.0-or-later
#include "reference/inverses.hpp"

#include <Eigen/Eigenvalues>
#include <Eigen/LU>

#include <cmath>

namespace headwater::reference {
namespace {

using Eigen::Index;
using Eigen::MatrixXd;

Eigen::Matrix3d square_root(const Eigen::Matrix3d& block) {
  return Eigen::SelfAdjointEigenSolver<Eigen::Matrix3d>(block).operatorSqrt();
}

}  // namespace

MatrixXd minimum_norm(const MatrixXd& k, const MatrixXd& c, double lambda, double depth_exponent) {
  Eigen::VectorXd r(k.cols());
  for (Index l = 0; l < k.cols() / 3; ++l)
    r.segment<3>(3 * l).setConstant(
        std::pow(k.middleCols(3 * l, 3).squaredNorm(), -depth_exponent));
  const MatrixXd gram = k * r.asDiagonal() * k.transpose() + lambda * c;
  return r.asDiagonal() * k.transpose() * gram.inverse();
}

MatrixXd sloreta(const MatrixXd& k, const MatrixXd& c, double lambda) {
  MatrixXd t = k.transpose() * (k * k.transpose() + lambda * c).inverse();
  for (Index l = 0; l < k.cols() / 3; ++l) {
    const Eigen::Matrix3d s = t.middleRows(3 * l, 3) * k.middleCols(3 * l, 3);
    const MatrixXd row = square_root((s + s.transpose()) / 2).inverse() * t.middleRows(3 * l, 3);
    t.middleRows(3 * l, 3) = row;
  }
  return t;
}

MatrixXd eloreta(const MatrixXd& k, const MatrixXd& c, double lambda, int iterations) {
  MatrixXd inverse_weight = MatrixXd::Identity(k.cols(), k.cols());
  for (int i = 0; i < iterations; ++i) {
    const MatrixXd m = (k * inverse_weight * k.transpose() + lambda * c).inverse();
    for (Index l = 0; l < k.cols() / 3; ++l) {
      const Eigen::Matrix3d block = k.middleCols(3 * l, 3).transpose() * m * k.middleCols(3 * l, 3);
      inverse_weight.block(3 * l, 3 * l, 3, 3) =
          square_root((block + block.transpose()) / 2).inverse();
    }
  }
  return inverse_weight * k.transpose() *
         (k * inverse_weight * k.transpose() + lambda * c).inverse();
}

MatrixXd lcmv_unit_gain(const MatrixXd& k, const MatrixXd& d, const std::vector<Index>* mirror) {
  const MatrixXd inverse = d.inverse();
  MatrixXd filters(k.cols(), k.rows());
  for (Index l = 0; l < k.cols() / 3; ++l) {
    MatrixXd own = k.middleCols(3 * l, 3);
    const Index partner = mirror ? (*mirror)[static_cast<std::size_t>(l)] : -1;
    if (partner >= 0 && partner != l) {
      own.conservativeResize(Eigen::NoChange, 6);
      own.rightCols(3) = k.middleCols(3 * partner, 3);
    }
    const MatrixXd all = (own.transpose() * inverse * own).inverse() * own.transpose() * inverse;
    filters.middleRows(3 * l, 3) = all.topRows(3);
  }
  return filters;
}

Eigen::RowVectorXd lcmv_along(const MatrixXd& k, const MatrixXd& d, Index point,
                              const Eigen::Vector3d& direction) {
  const Eigen::VectorXd gain = k.middleCols(3 * point, 3) * direction;
  const Eigen::RowVectorXd filter = gain.transpose() * d.inverse();
  return filter / filter.dot(gain);
}

}  // namespace headwater::reference
