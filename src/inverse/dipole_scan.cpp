// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/units.hpp>
#include <headwater/inverse/dipole_scan.hpp>

#include <Eigen/QR>

#include <algorithm>
#include <cmath>

namespace headwater {
namespace {

constexpr double kNearestHalf = 20 * kMillimetre;  // from the midline
constexpr double kEvidence = 2;
constexpr double kWeakerHalf = 1.0 / 3;  // of the stronger half's moment

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
    : subspace_(&subspace), grid_(&grid), one_{3, {}, subspace.gain}, pair_{6, {}, {}} {
  for (Eigen::Index p = 0; p < grid.size(); ++p) {
    one_.points.push_back(p);
    const Eigen::Index image = grid.mirror[static_cast<std::size_t>(p)];
    if (grid.mni_m(0, p) >= kNearestHalf && image >= 0 && image != p) pair_.points.push_back(p);
  }
  pair_.basis.resize(subspace.dimension(), static_cast<Eigen::Index>(6 * pair_.points.size()));
  for (std::size_t i = 0; i < pair_.points.size(); ++i) {
    const Eigen::Index point = pair_.points[i];
    const Eigen::Index image = grid.mirror[static_cast<std::size_t>(point)];
    auto block = pair_.basis.middleCols<6>(static_cast<Eigen::Index>(6 * i));
    block << subspace.gain.middleCols<3>(3 * point), subspace.gain.middleCols<3>(3 * image);
    orthonormalise(block);
  }
  for (Eigen::Index p = 0; p < grid.size(); ++p) orthonormalise(one_.basis.middleCols<3>(3 * p));
}

DipoleFit DipoleScan::fit(const Candidates& candidates, Eigen::Index place, double unexplained,
                          const Eigen::VectorXd& y, const Eigen::VectorXd& without) const {
  const int width = candidates.width;
  DipoleFit fit;
  fit.point = candidates.points[static_cast<std::size_t>(place)];
  fit.unexplained = std::max(unexplained, 0.0);
  const double n = static_cast<double>(y.size()) - (without.size() > 0 ? 1 : 0);
  const double parameters = width + 3;
  // Below 1e-15 the residual is rounding: one floor keeps the logarithm finite.
  fit.criterion = n * std::log(std::max(fit.unexplained, 1e-15)) + parameters * std::log(n);
  Eigen::MatrixXd columns(y.size(), width + (without.size() > 0 ? 1 : 0));
  columns.leftCols<3>() = subspace_->gain.middleCols<3>(3 * fit.point);
  if (width == 6) {
    fit.partner = grid_->mirror[static_cast<std::size_t>(fit.point)];
    columns.middleCols<3>(3) = subspace_->gain.middleCols<3>(3 * fit.partner);
  }
  // Gains are of another size than an indicator: scaled, so that pivoting compares like with like.
  if (without.size() > 0) columns.col(width) = without * columns.col(0).norm();
  const Eigen::VectorXd moment = columns.colPivHouseholderQr().solve(y);
  fit.moment_Am = moment.head<3>();
  if (width == 6) fit.partner_moment_Am = moment.segment<3>(3);
  return fit;
}

DipoleFit DipoleScan::best(const Candidates& candidates, const Eigen::VectorXd& y) const {
  if (candidates.points.empty()) return {};
  const Eigen::VectorXd projections = candidates.basis.transpose() * y;
  const Eigen::VectorXd explained =
      Eigen::Map<const Eigen::MatrixXd>(projections.data(), candidates.width,
                                        projections.size() / candidates.width)
          .colwise()
          .squaredNorm();
  Eigen::Index winner = 0;
  const double most = explained.maxCoeff(&winner), total = y.squaredNorm();
  return fit(candidates, winner, total > 0 ? 1 - most / total : 1, y, {});
}

std::vector<DipoleFit> DipoleScan::best_without_leads(const Candidates& candidates,
                                                      const Eigen::VectorXd& y) const {
  const Eigen::MatrixXd leads = subspace_->basis.transpose();  // columns B'e_m
  std::vector<DipoleFit> fits(static_cast<std::size_t>(leads.cols()));
  if (candidates.points.empty()) return fits;
  const int width = candidates.width;
  const Eigen::VectorXd projections = candidates.basis.transpose() * y;  // Q'y
  const Eigen::MatrixXd seen = candidates.basis.transpose() * leads;     // Q'u
  const double total = y.squaredNorm();
  for (Eigen::Index m = 0; m < leads.cols(); ++m) {
    const double along = leads.col(m).dot(y), length = leads.col(m).squaredNorm();
    Eigen::Index winner = 0;
    double least = total;
    for (Eigen::Index l = 0; l * width < projections.size(); ++l) {
      const auto q = projections.segment(l * width, width);
      const auto qu = seen.col(m).segment(l * width, width);
      // The part of the lead's indicator outside the candidate's columns takes its share of the
      // rest.
      const double rest = length - qu.squaredNorm(), part = along - qu.dot(q);
      double residual = total - q.squaredNorm();
      if (rest > 1e-12 * length) residual -= part * part / rest;
      if (residual < least) {
        least = residual;
        winner = l;
      }
    }
    const double kept = total - along * along / length;
    fits[static_cast<std::size_t>(m)] =
        fit(candidates, winner, kept > 0 ? least / kept : 1, y, leads.col(m));
  }
  return fits;
}

namespace {

/// Fills in whether the pair is preferred.
DipoleVerdict judged(DipoleFit one, DipoleFit pair) {
  const double right = pair.moment_Am.norm(), left = pair.partner_moment_Am.norm();
  const bool preferred = pair.point >= 0 && pair.criterion < one.criterion - kEvidence &&
                         std::min(left, right) >= kWeakerHalf * std::max(left, right);
  return {std::move(one), std::move(pair), preferred};
}

}  // namespace

DipoleVerdict DipoleScan::judge(const Eigen::VectorXd& map_V) const {
  const Eigen::VectorXd y = subspace_->basis.transpose() * map_V;
  return judged(best(one_, y), best(pair_, y));
}

std::vector<DipoleVerdict> DipoleScan::judge_without_leads(const Eigen::VectorXd& map_V) const {
  const Eigen::VectorXd y = subspace_->basis.transpose() * map_V;
  const auto one = best_without_leads(one_, y), pair = best_without_leads(pair_, y);
  std::vector<DipoleVerdict> verdicts;
  for (std::size_t m = 0; m < one.size(); ++m) verdicts.push_back(judged(one[m], pair[m]));
  return verdicts;
}

}  // namespace headwater
