// SPDX-License-Identifier: GPL-3.0-or-later
// X = A Z with A (3K by r) the region's rows of the operator and Z = map d. With Z Z' = E E' (E r
// by q, q the rank) the left singular vectors of X are A E v, v the eigenvectors of E'(A'A)E:
// whatever the numbers of points and samples, the eigenproblem is q by q, and only its largest pair
// is needed.
#include <headwater/base/eigenproblem.hpp>
#include <headwater/inverse/region_courses.hpp>

#include <Eigen/Eigenvalues>

#include <cmath>

namespace headwater {
namespace {

/// E of the header comment: columns of eigenvectors times the root of their eigenvalues.
Eigen::MatrixXd root_of_gram(const Eigen::MatrixXd& z) {
  const Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd> solver(z * z.transpose());
  const Eigen::VectorXd& values = solver.eigenvalues();
  const double smallest = 1e-14 * values[values.size() - 1];
  Eigen::Index rank = 0;
  while (rank < values.size() && values[values.size() - 1 - rank] > smallest) ++rank;
  return solver.eigenvectors().rightCols(rank) * values.tail(rank).cwiseSqrt().asDiagonal();
}

struct Pattern {
  Eigen::VectorXd direction;  // 3K, each block of length 1 (or 0)
  double share = 0;
};

/// kernel: M-1 by 3K, the region's columns of the operator's; form: kernel kernel'; root: E.
Pattern dominant_pattern(const Eigen::MatrixXd& kernel, const Eigen::MatrixXd& form,
                         const Eigen::MatrixXd& root, const Eigen::Matrix3Xd& outward) {
  Pattern pattern{Eigen::VectorXd::Zero(kernel.cols()), 0};
  if (root.cols() == 0) return pattern;  // data of zeros
  const Eigen::MatrixXd small = root.transpose() * (form * root);
  const double total = small.trace();
  if (!(total > 0)) return pattern;
  const Eigenpair largest = largest_eigenpair((small + small.transpose()) / 2);
  pattern.share = largest.value / total;
  Eigen::VectorXd u = kernel.transpose() * (root * largest.vector);
  double outwards = 0;
  for (Eigen::Index k = 0; k < outward.cols(); ++k)
    outwards += u.segment<3>(3 * k).dot(outward.col(k));
  if (outwards < 0) u = -u;
  for (Eigen::Index k = 0; k < outward.cols(); ++k) {
    const double length = u.segment<3>(3 * k).norm();
    if (length > 0) u.segment<3>(3 * k) /= length;
  }
  pattern.direction = std::move(u);
  return pattern;
}

/// The region's columns of the operator's kernel, side by side.
Eigen::MatrixXd region_kernel(const SourceOperator& inverse, const Region& region) {
  Eigen::MatrixXd kernel(inverse.kernel.rows(),
                         static_cast<Eigen::Index>(3 * region.points.size()));
  for (std::size_t k = 0; k < region.points.size(); ++k)
    kernel.middleCols<3>(static_cast<Eigen::Index>(3 * k)) =
        inverse.kernel.middleCols<3>(3 * region.points[k]);
  return kernel;
}

}  // namespace

std::vector<Eigen::MatrixXd> region_forms(const SourceOperator& inverse,
                                          const std::vector<Region>& regions) {
  const Eigen::Index dimension = inverse.kernel.rows();
  std::vector<Eigen::MatrixXd> forms;
  for (const auto& region : regions) {
    Eigen::MatrixXd form = Eigen::MatrixXd::Zero(dimension, dimension);
    form.selfadjointView<Eigen::Lower>().rankUpdate(region_kernel(inverse, region));
    form.triangularView<Eigen::StrictlyUpper>() = form.transpose();
    forms.push_back(std::move(form));
  }
  return forms;
}

RegionCourses region_courses(const SourceOperator& inverse,
                             const std::vector<Eigen::MatrixXd>& forms,
                             const Eigen::MatrixXd& data_V, const std::vector<Region>& regions,
                             const Eigen::Matrix3Xd& outward) {
  const auto count = static_cast<Eigen::Index>(regions.size());
  const Eigen::MatrixXd z = inverse.map * data_V;
  const Eigen::MatrixXd root = root_of_gram(z);
  RegionCourses courses{Eigen::MatrixXd::Zero(count, z.cols()),
                        Eigen::MatrixXd::Zero(count, z.cols()), Eigen::VectorXd::Zero(count)};
  for (Eigen::Index r = 0; r < count; ++r) {
    const auto& region = regions[static_cast<std::size_t>(r)];
    const auto& form = forms[static_cast<std::size_t>(r)];
    const auto size = static_cast<double>(region.points.size());
    const Eigen::MatrixXd kernel = region_kernel(inverse, region);
    const Eigen::Matrix3Xd normals = outward(Eigen::all, region.points);
    const Pattern pattern = dominant_pattern(kernel, form, root, normals);
    courses.share[r] = pattern.share;
    // The projected course is linear in the data: one row of weights for the region.
    courses.projected.row(r) = (kernel * pattern.direction).transpose() / size * z;
    // Rounding may leave a power of nothing below zero.
    courses.rms.row(r) =
        ((z.array() * (form * z).array()).colwise().sum() / size).cwiseMax(0).sqrt();
  }
  return courses;
}

}  // namespace headwater
