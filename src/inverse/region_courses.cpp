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

/// kernel: r by 3K, the region's columns of the operator's (A'); root: E.
Pattern dominant_pattern(const Eigen::MatrixXd& kernel, const Eigen::MatrixXd& root,
                         const Eigen::Matrix3Xd& outward) {
  Pattern pattern{Eigen::VectorXd::Zero(kernel.cols()), 0};
  if (root.cols() == 0) return pattern;  // data of zeros
  Eigen::MatrixXd gram = Eigen::MatrixXd::Zero(kernel.rows(), kernel.rows());
  gram.selfadjointView<Eigen::Lower>().rankUpdate(kernel);
  const Eigen::MatrixXd small =
      root.transpose() * (gram.selfadjointView<Eigen::Lower>() * root).eval();
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

}  // namespace

RegionCourses region_courses(const SourceOperator& inverse, const SourceEstimate& estimate,
                             const Eigen::MatrixXd& data_V, const std::vector<Region>& regions,
                             const Eigen::Matrix3Xd& outward) {
  const auto count = static_cast<Eigen::Index>(regions.size());
  const Eigen::Index samples = data_V.cols();
  RegionCourses courses{Eigen::MatrixXd::Zero(count, samples),
                        Eigen::MatrixXd::Zero(count, samples), Eigen::VectorXd::Zero(count)};
  const Eigen::MatrixXd root = root_of_gram(inverse.map * data_V);
  for (Eigen::Index r = 0; r < count; ++r) {
    const auto& points = regions[static_cast<std::size_t>(r)].points;
    const auto size = static_cast<Eigen::Index>(points.size());
    Eigen::MatrixXd kernel(inverse.kernel.rows(), 3 * size);
    Eigen::Matrix3Xd normals(3, size);
    for (Eigen::Index k = 0; k < size; ++k) {
      const Eigen::Index p = points[static_cast<std::size_t>(k)];
      kernel.middleCols<3>(3 * k) = inverse.kernel.middleCols<3>(3 * p);
      normals.col(k) = outward.col(p);
    }
    const Pattern pattern = dominant_pattern(kernel, root, normals);
    courses.share[r] = pattern.share;
    // The projected course is linear in the data: one row of weights for the region.
    const Eigen::RowVectorXd weights =
        (kernel * pattern.direction).transpose() / static_cast<double>(size);
    courses.projected.row(r) = weights * (inverse.map * data_V);
    for (Eigen::Index t = 0; t < samples; ++t) {
      double power = 0;
      for (const Eigen::Index p : points)
        power += estimate.amplitude(p, t) * estimate.amplitude(p, t);
      courses.rms(r, t) = std::sqrt(power / static_cast<double>(size));
    }
  }
  return courses;
}

}  // namespace headwater
