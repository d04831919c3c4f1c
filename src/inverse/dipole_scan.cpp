// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/units.hpp>
#include <headwater/inverse/dipole_scan.hpp>

#include <Eigen/QR>

#include <cmath>

namespace headwater {
namespace {

constexpr double kNearestHalf = 20 * kMillimetre;  // from the midline
constexpr double kEvidence = 2;

/// Orthonormalises the columns of q in place: modified Gram-Schmidt, twice (Giraud et al. 2005
/// Numer Math 101:87: two passes reach rounding for the well-conditioned blocks met here).
template <typename Columns>
void orthonormalise(Columns q) {
  for (int pass = 0; pass < 2; ++pass)
    for (Eigen::Index k = 0; k < q.cols(); ++k) {
      for (Eigen::Index j = 0; j < k; ++j) q.col(k) -= q.col(j).dot(q.col(k)) * q.col(j);
      q.col(k).normalize();
    }
}

}  // namespace

DipoleScan::DipoleScan(const Subspace& subspace, const SourceGrid& grid)
    : subspace_(&subspace), grid_(&grid), one_(subspace.gain) {
  for (Eigen::Index p = 0; p < grid.size(); ++p) {
    all_.push_back(p);
    const Eigen::Index image = grid.mirror[static_cast<std::size_t>(p)];
    if (grid.mni_m(0, p) >= kNearestHalf && image >= 0 && image != p) right_.push_back(p);
  }
  pair_.resize(subspace.dimension(), static_cast<Eigen::Index>(6 * right_.size()));
  for (std::size_t i = 0; i < right_.size(); ++i) {
    const Eigen::Index point = right_[i], image = grid.mirror[static_cast<std::size_t>(point)];
    auto block = pair_.middleCols<6>(static_cast<Eigen::Index>(6 * i));
    block << subspace.gain.middleCols<3>(3 * point), subspace.gain.middleCols<3>(3 * image);
    orthonormalise(block);
  }
  for (Eigen::Index p = 0; p < grid.size(); ++p) orthonormalise(one_.middleCols<3>(3 * p));
}

DipoleFit DipoleScan::best(const Eigen::VectorXd& y, const Eigen::MatrixXd& basis,
                           const std::vector<Eigen::Index>& points, int width) const {
  DipoleFit fit;
  if (points.empty()) return fit;
  const Eigen::VectorXd projections = basis.transpose() * y;
  const Eigen::VectorXd explained =
      Eigen::Map<const Eigen::MatrixXd>(projections.data(), width, projections.size() / width)
          .colwise()
          .squaredNorm();
  Eigen::Index winner = 0;
  const double most = explained.maxCoeff(&winner), total = y.squaredNorm();
  fit.point = points[static_cast<std::size_t>(winner)];
  fit.unexplained = total > 0 ? std::max(1 - most / total, 0.0) : 1;
  const double n = static_cast<double>(y.size()), parameters = width + 3;
  // Below 1e-15 the residual is rounding: one floor keeps the logarithm finite.
  fit.criterion = n * std::log(std::max(fit.unexplained, 1e-15)) + parameters * std::log(n);
  Eigen::MatrixXd columns(y.size(), width);
  columns.leftCols<3>() = subspace_->gain.middleCols<3>(3 * fit.point);
  if (width == 6) {
    fit.partner = grid_->mirror[static_cast<std::size_t>(fit.point)];
    columns.rightCols<3>() = subspace_->gain.middleCols<3>(3 * fit.partner);
  }
  const Eigen::VectorXd moment = columns.colPivHouseholderQr().solve(y);
  fit.moment_Am = moment.head<3>();
  if (width == 6) fit.partner_moment_Am = moment.tail<3>();
  return fit;
}

DipoleVerdict DipoleScan::judge(const Eigen::VectorXd& map_V) const {
  const Eigen::VectorXd y = subspace_->basis.transpose() * map_V;
  DipoleVerdict verdict;
  verdict.one = best(y, one_, all_, 3);
  verdict.pair = best(y, pair_, right_, 6);
  verdict.pair_preferred =
      verdict.pair.point >= 0 && verdict.pair.criterion < verdict.one.criterion - kEvidence;
  return verdict;
}

}  // namespace headwater
