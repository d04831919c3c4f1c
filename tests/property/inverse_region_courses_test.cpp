// SPDX-License-Identifier: GPL-3.0-or-later
#include "inverse_support.hpp"

#include <headwater/inverse/lcmv.hpp>
#include <headwater/inverse/region_courses.hpp>
#include <headwater/inverse/sloreta.hpp>

#include <Eigen/SVD>
#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

using Eigen::MatrixXd;

/// An operator that hands the data through: J = d. For cases with moments known by hand.
SourceOperator pass_through(Eigen::Index points) {
  SourceOperator inverse;
  inverse.kernel = inverse.map = MatrixXd::Identity(3 * points, 3 * points);
  return inverse;
}

RegionCourses courses_of(const SourceOperator& inverse, const MatrixXd& data,
                         const std::vector<Region>& regions, const Eigen::Matrix3Xd& outward) {
  return region_courses(inverse, region_forms(inverse, regions), data, regions, outward);
}

Region all_points(Eigen::Index count) {
  Region region;
  for (Eigen::Index p = 0; p < count; ++p) region.points.push_back(p);
  return region;
}

const Eigen::RowVectorXd kCourse = Eigen::ArrayXd::LinSpaced(50, 0, 9).sin().matrix();

TEST(RegionCourses, RecoverTheCourseOfAPattern) {
  RandomStream random(1, "pattern");
  const Eigen::VectorXd pattern = random.normal_matrix(15, 1);
  const Eigen::Matrix3Xd outward = random.normal_matrix(3, 5).colwise().normalized();
  const MatrixXd data = pattern * kCourse;
  const RegionCourses courses = courses_of(pass_through(5), data, {all_points(5)}, outward);
  const Eigen::Map<const Eigen::Matrix3Xd> moments(pattern.data(), 3, 5);
  const double balance = (moments.array() * outward.array()).sum() > 0 ? 1 : -1;
  const double mean_length = moments.colwise().norm().mean();
  EXPECT_LE((courses.projected - balance * mean_length * kCourse).cwiseAbs().maxCoeff(), 1e-12);
  const double rms = std::sqrt(moments.squaredNorm() / 5);
  EXPECT_LE((courses.rms - rms * kCourse.cwiseAbs()).cwiseAbs().maxCoeff(), 1e-12);
  EXPECT_NEAR(courses.share[0], 1, 1e-12);
}

// A mean of moments, or of their outward parts, would be zero here.
TEST(RegionCourses, OppositeWallsDoNotCancel) {
  Eigen::Matrix3Xd outward(3, 2);
  outward << 0, 0, 0, 0, 1, 1;
  Eigen::VectorXd walls(6);
  walls << 0, 1, 0.01, 0, -1,
      0.01;  // two walls of a sulcus; a trace of outward flow settles the sign
  const MatrixXd data = walls * kCourse;
  const RegionCourses courses = courses_of(pass_through(2), data, {all_points(2)}, outward);
  EXPECT_LE((courses.projected - std::hypot(1, 0.01) * kCourse).cwiseAbs().maxCoeff(), 1e-12);
  EXPECT_LE((courses.projected.cwiseAbs() - courses.rms).cwiseAbs().maxCoeff(), 1e-12);
}

// The pattern is the first left singular vector of the points' components, from a dense
// decomposition.
TEST(RegionCourses, PatternIsTheFirstSingularVector) {
  const InverseCase& c = coarse_case();
  RandomStream random(2, "svd");
  MatrixXd data = 0.1 * c.noise_maps(random, 60);
  for (int t = 0; t < 60; ++t)
    data.col(t) += c.map_of(200, {1e-8, 2e-8, -1e-8}) * std::sin(0.2 * t);
  const Sloreta smooth(c.subspace);
  const MatrixXd y = c.subspace.basis.transpose() * data;
  const std::vector<SourceOperator> operators{
      smooth.at(1e-3 * smooth.spectrum().values.maxCoeff() / 0.01, 0.01),
      Lcmv(c.subspace, y * y.transpose() / 60.0, c.outward, c.grid.mirror, {}).at(0.01)};
  const auto regions = lobe_regions(template_labels(c.grid));
  ASSERT_GE(regions.size(), 8u);
  for (const auto& inverse : operators) {
    const SourceEstimate estimate = estimate_sources(inverse, data);
    const RegionCourses courses =
        region_courses(inverse, region_forms(inverse, regions), data, regions, c.outward);
    for (std::size_t r = 0; r < regions.size(); ++r) {
      const auto size = static_cast<Eigen::Index>(regions[r].points.size());
      MatrixXd x(3 * size, 60);
      Eigen::Matrix3Xd outward(3, size);
      for (Eigen::Index k = 0; k < size; ++k) {
        x.middleRows<3>(3 * k) =
            estimate.components.middleRows<3>(3 * regions[r].points[static_cast<std::size_t>(k)]);
        outward.col(k) = c.outward.col(regions[r].points[static_cast<std::size_t>(k)]);
      }
      const Eigen::BDCSVD<MatrixXd> svd(x, Eigen::ComputeThinU);
      Eigen::VectorXd u = svd.matrixU().col(0);
      const Eigen::Map<Eigen::Matrix3Xd> blocks(u.data(), 3, size);
      if ((blocks.array() * outward.array()).sum() < 0) u = -u;
      for (Eigen::Index k = 0; k < size; ++k) u.segment<3>(3 * k).normalize();
      const Eigen::RowVectorXd expected = u.transpose() * x / static_cast<double>(size);
      const auto row = static_cast<Eigen::Index>(r);
      // Between singular values that lie close the vectors are uncertain by rounding over their
      // gap.
      EXPECT_LE((courses.projected.row(row) - expected).cwiseAbs().maxCoeff(),
                1e-7 * expected.cwiseAbs().maxCoeff())
          << regions[r].name;
      EXPECT_NEAR(courses.share[row], svd.singularValues().array().square()[0] / x.squaredNorm(),
                  1e-10);
      EXPECT_LE((courses.rms.row(row).array() -
                 (x.array().square().colwise().sum() / static_cast<double>(size)).sqrt())
                    .abs()
                    .maxCoeff(),
                1e-12 * courses.rms.row(row).maxCoeff());
      EXPECT_LE((courses.projected.row(row).cwiseAbs() - courses.rms.row(row)).maxCoeff(),
                1e-12 * courses.rms.row(row).maxCoeff());
    }
  }
}

// More data of the same kind, or the same data turned over, must not flip a course against the
// data.
TEST(RegionCourses, SignFollowsTheData) {
  const InverseCase& c = coarse_case();
  const Sloreta smooth(c.subspace);
  const SourceOperator inverse = smooth.at(1e-3 * smooth.spectrum().values.maxCoeff(), 1);
  const auto regions = lobe_regions(template_labels(c.grid));
  RandomStream random(3, "sign");
  const MatrixXd data = c.noise_maps(random, 30);
  const RegionCourses courses = courses_of(inverse, data, regions, c.outward);
  const RegionCourses turned = courses_of(inverse, -data, regions, c.outward);
  MatrixXd twice(31, 60);
  twice << data, data;
  const RegionCourses longer = courses_of(inverse, twice, regions, c.outward);
  EXPECT_LE((courses.projected + turned.projected).cwiseAbs().maxCoeff(),
            1e-8 * courses.projected.cwiseAbs().maxCoeff());
  EXPECT_LE((courses.projected - longer.projected.leftCols(30)).cwiseAbs().maxCoeff(),
            1e-8 * courses.projected.cwiseAbs().maxCoeff());
}

}  // namespace
}  // namespace headwater
