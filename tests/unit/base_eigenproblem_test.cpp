// SPDX-License-Identifier: GPL-3.0-or-later
// Against Eigen's full decomposition, on sizes below and above the switch to Lanczos iteration.
#include <headwater/base/eigenproblem.hpp>
#include <headwater/base/random.hpp>

#include <Eigen/Eigenvalues>
#include <gtest/gtest.h>

namespace headwater {
namespace {

class BaseEigenproblem : public testing::TestWithParam<int> {};

TEST_P(BaseEigenproblem, AgreesWithTheFullDecomposition) {
  const int n = GetParam();
  RandomStream random(7, "eigenproblem");
  const Eigen::MatrixXd half = random.normal_matrix(n, 2 * n);
  for (const double scale : {1e-24, 1e-20, 1e-17, 1e-12, 1.0, 1e16}) {
    const Eigen::MatrixXd a = scale * half * half.transpose();
    const Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd> whole(a);
    const Eigenpair pair = largest_eigenpair(a);
    const double value = whole.eigenvalues()[n - 1];
    EXPECT_NEAR(pair.value, value, 1e-9 * value);
    EXPECT_NEAR(pair.vector.norm(), 1, 1e-12);
    EXPECT_LT((a * pair.vector - pair.value * pair.vector).norm(), 1e-8 * value);
  }
}

INSTANTIATE_TEST_SUITE_P(Sizes, BaseEigenproblem, testing::Values(1, 2, 23, 24, 63, 127));

TEST(BaseEigenproblem, TakesZerosAndEqualEigenvalues) {
  EXPECT_EQ(largest_eigenpair(Eigen::MatrixXd::Zero(40, 40)).value, 0);
  EXPECT_NEAR(largest_eigenpair(Eigen::MatrixXd::Identity(40, 40)).value, 1, 1e-12);
}

TEST(BaseEigenproblem, GivesTheSameBitsEachTime) {
  RandomStream random(8, "eigenproblem");
  const Eigen::MatrixXd half = random.normal_matrix(50, 50);
  const Eigen::MatrixXd a = half + half.transpose();
  EXPECT_EQ(largest_eigenpair(a).vector, largest_eigenpair(a).vector);
}

}  // namespace
}  // namespace headwater
