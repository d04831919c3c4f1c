// SPDX-License-Identifier: GPL-3.0-or-later
#include "base_scratch.hpp"

#include <headwater/base/error.hpp>
#include <headwater/base/random.hpp>
#include <headwater/signal/reference.hpp>

#include <gtest/gtest.h>

namespace headwater {
namespace {

const Labels kLabels{"Fz", "M1", "Cz", "M2"};

TEST(SignalReference, SubtractsWhatItSays) {
  const Eigen::Vector4d data(3, 1, 4, 2);
  const Eigen::VectorXd average = average_reference(4) * data;
  EXPECT_TRUE(average.isApprox(Eigen::Vector4d(0.5, -1.5, 1.5, -0.5), 1e-15));
  const Eigen::VectorXd vertex = channel_reference(kLabels, {"cz"}) * data;
  EXPECT_TRUE(vertex.isApprox(Eigen::Vector4d(-1, -3, 0, -2), 1e-15));
  const Eigen::VectorXd mastoids = channel_reference(kLabels, {"M1", "m2", "M2"}) * data;
  EXPECT_TRUE(mastoids.isApprox(Eigen::Vector4d(1.5, -0.5, 2.5, 0.5), 1e-15));
}

TEST(SignalReference, IsAProjectionThatForgetsTheOldReference) {
  for (const Eigen::MatrixXd& h : {average_reference(4), channel_reference(kLabels, {"Fz"}),
                                   channel_reference(kLabels, {"M1", "M2"})}) {
    EXPECT_LT((h * Eigen::VectorXd::Ones(4)).cwiseAbs().maxCoeff(), 1e-15);
    EXPECT_LT((h * h - h).cwiseAbs().maxCoeff(), 1e-15);
    EXPECT_LT((h * average_reference(4) - h).cwiseAbs().maxCoeff(), 1e-15);
  }
}

TEST(SignalReference, BasisSpansWhatNoReferenceChanges) {
  for (const Eigen::Index channels : {2, 3, 31, 64, 257}) {
    const Eigen::MatrixXd b = reference_free_basis(channels);
    ASSERT_EQ(b.rows(), channels);
    ASSERT_EQ(b.cols(), channels - 1);
    const double rounding = 4e-16 * static_cast<double>(channels);
    EXPECT_LT((b.transpose() * b - Eigen::MatrixXd::Identity(channels - 1, channels - 1))
                  .cwiseAbs()
                  .maxCoeff(),
              rounding);
    EXPECT_LT((b * b.transpose() - average_reference(channels)).cwiseAbs().maxCoeff(), rounding);
    EXPECT_LT((Eigen::RowVectorXd::Ones(channels) * b).cwiseAbs().maxCoeff(), rounding);
  }
}

TEST(SignalReference, ListsEveryUnknownName) {
  const std::string message = message_of<InputError>([] {
    channel_reference(kLabels, {"A1", "Cz", "A2"});
  });
  EXPECT_NE(message.find("A1 and A2"), std::string::npos) << message;
  EXPECT_NE(message.find("Fz, M1, Cz and M2"), std::string::npos) << message;
  EXPECT_THROW(channel_reference(kLabels, {}), InputError);
}

}  // namespace
}  // namespace headwater
