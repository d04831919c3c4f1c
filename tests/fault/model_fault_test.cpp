// SPDX-License-Identifier: GPL-3.0-or-later
// Heads, electrodes and points that no lead field should accept in silence.
#include "base_scratch.hpp"

#include <headwater/base/error.hpp>
#include <headwater/model/head.hpp>
#include <headwater/model/lead_field.hpp>

#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

TEST(ModelFault, RefusesPointsOutsideTheBrain) {
  const Eigen::Matrix3Xd electrodes = Eigen::Vector3d::UnitZ();
  const HeadModel head = default_head();
  Eigen::Matrix3Xd points(3, 2);
  points << 0, 0, 0, 0, 0.01, 0.0805;
  const std::string message =
      message_of<InputError>([&] { compute_gain(head, electrodes, points); });
  EXPECT_NE(message.find("Point 2"), std::string::npos) << message;
  EXPECT_NE(message.find("80.5"), std::string::npos) << message;
  EXPECT_NE(message.find("80.04"), std::string::npos) << message;
  points(2, 1) = head.radii_m[0];  // on the shell
  EXPECT_THROW(compute_gain(head, electrodes, points), InputError);
  points(2, 1) = std::nan("");
  EXPECT_THROW(compute_gain(head, electrodes, points), InputError);
}

TEST(ModelFault, RefusesElectrodesWithoutDirection) {
  Eigen::Matrix3Xd electrodes(3, 2);
  electrodes << 0, 0, 0, 0, 1, 0;
  const Eigen::Vector3d point(0, 0, 0.05);
  EXPECT_NE(message_of<InputError>([&] {
              compute_gain(default_head(), electrodes, point);
            }).find("Electrode 2"),
            std::string::npos);
  electrodes(0, 1) = std::nan("");
  EXPECT_THROW(compute_gain(default_head(), electrodes, point), InputError);
}

TEST(ModelFault, RefusesHeadsThatAreNone) {
  const auto changed = [](auto&& change) {
    HeadModel head = default_head();
    change(head);
    EXPECT_THROW(compute_gain(head, Eigen::Vector3d::UnitZ(), Eigen::Vector3d(0, 0, 0.01)),
                 ExperimentError);
  };
  changed([](HeadModel& head) { head.radii_m *= 1000; });  // mm for m
  changed([](HeadModel& head) { head.radii_m[1] = head.radii_m[0]; });
  changed([](HeadModel& head) { head.conductivity_S_per_m[1] = 0; });
  changed([](HeadModel& head) { head.conductivity_S_per_m[1] = std::nan(""); });
  changed([](HeadModel& head) { head.conductivity_S_per_m = Eigen::VectorXd::Ones(2); });
  changed([](HeadModel& head) { head.radii_m.resize(0); });
}

}  // namespace
}  // namespace headwater
