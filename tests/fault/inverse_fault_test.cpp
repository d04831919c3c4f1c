// SPDX-License-Identifier: GPL-3.0-or-later
// Covariances and sizes that no inverse should accept in silence.
#include "base_scratch.hpp"
#include "inverse_support.hpp"

#include <headwater/base/error.hpp>
#include <headwater/inverse/lcmv.hpp>
#include <headwater/inverse/region_courses.hpp>
#include <headwater/inverse/regularisation.hpp>
#include <headwater/inverse/sloreta.hpp>

#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

using Eigen::MatrixXd;

TEST(InverseFault, SizesThatDisagree) {
  const InverseCase& c = coarse_case();
  const std::string message = message_of<InputError>(
      [&] { make_subspace(c.labels, c.gain.topRows(30), c.subspace.noise_V2); });
  EXPECT_NE(message.find("31 channels"), std::string::npos) << message;
  EXPECT_NE(message.find("30 x"), std::string::npos) << message;
  EXPECT_THROW(make_subspace(c.labels, c.gain.leftCols(10), c.subspace.noise_V2), InputError);
  EXPECT_THROW(make_subspace(c.labels, c.gain, c.sensor_noise), InputError);
}

TEST(InverseFault, NoiseThatIsNoCovariance) {
  const InverseCase& c = coarse_case();
  EXPECT_THROW(make_subspace(c.labels, c.gain, -c.subspace.noise_V2), InputError);
  MatrixXd noise = c.subspace.noise_V2;
  noise(3, 3) = std::nan("");
  EXPECT_THROW(make_subspace(c.labels, c.gain, noise), InputError);
  // Rank 10 of 30: rounding may let a factorisation pass, with filters of pure rounding behind it.
  RandomStream random(1, "rank");
  const MatrixXd few = 1e-6 * random.normal_matrix(30, 10);
  EXPECT_THROW(make_subspace(c.labels, c.gain, few * few.transpose()), InputError);
  MatrixXd gain = c.gain;
  gain(0, 0) = std::nan("");
  EXPECT_THROW(make_subspace(c.labels, gain, c.subspace.noise_V2), InputError);
}

TEST(InverseFault, LcmvDataCovarianceOfLowRank) {
  const InverseCase& c = coarse_case();
  RandomStream random(2, "rank");
  const MatrixXd few = 1e-6 * random.normal_matrix(30, 10);
  LcmvOptions options;
  options.regularisation = 0;
  const std::string message = message_of<InputError>(
      [&] { Lcmv(c.subspace, few * few.transpose(), c.outward, c.grid.mirror, options); });
  EXPECT_NE(message.find("regularisation"), std::string::npos) << message;
  EXPECT_NO_THROW(Lcmv(c.subspace, few * few.transpose(), c.outward, c.grid.mirror, LcmvOptions{}));
  EXPECT_THROW(pooled_data_covariance({}, 0, 1), InputError);
  Average average;
  average.times_s = Eigen::VectorXd::LinSpaced(11, 0, 0.1);
  average.data_V = MatrixXd::Ones(5, 11);
  EXPECT_THROW(pooled_data_covariance({average}, 0.2, 0.3), InputError);
}

TEST(InverseFault, NothingToChooseLambdaFrom) {
  EXPECT_THROW(choose_regularisation(Eigen::VectorXd::Ones(3), MatrixXd(3, 0), {}), InputError);
}

// A contrast of zeros (a condition minus itself) has no pattern; it has courses of zeros.
TEST(InverseFault, RegionCoursesOfNothing) {
  const InverseCase& c = coarse_case();
  const SourceOperator inverse = Sloreta(c.subspace).at(1, 0.01);
  const MatrixXd zeros = MatrixXd::Zero(31, 5);
  Region region;
  region.points = {1, 2, 3};
  const RegionCourses courses =
      region_courses(inverse, region_forms(inverse, {region}), zeros, {region}, c.outward);
  EXPECT_EQ(courses.projected, MatrixXd::Zero(1, 5));
  EXPECT_EQ(courses.rms, MatrixXd::Zero(1, 5));
  EXPECT_EQ(courses.share[0], 0);
}

}  // namespace
}  // namespace headwater
