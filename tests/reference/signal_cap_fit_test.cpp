// SPDX-License-Identifier: GPL-3.0-or-later
// Digitised caps of real people, and a template cap. Sources:
//   caps          OpenNeuro ds004561, ds005403 (CC0); notes on the recordings: radius 96 to 106 mm,
//                 rms 3 to 6 mm; one cap has 6.506 mm and one 95.72 mm, a little beyond the notes'
//                 last digit
//   novel-sounds  electrodes.tsv of that set: a template sphere of 85 mm, RAS, origin at its centre
#include "signal_support.hpp"

#include <headwater/base/units.hpp>
#include <headwater/signal/cap_fit.hpp>
#include <headwater/signal/standard_cap.hpp>

#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

std::vector<std::filesystem::path> cap_files(const std::filesystem::path& folder) {
  std::vector<std::filesystem::path> files;
  for (const auto& entry : std::filesystem::directory_iterator(folder))
    if (entry.path().filename().string().ends_with("electrodes.tsv")) files.push_back(entry.path());
  return files;
}

TEST(SignalCapFit, RealCapsAreHeadsInTheHeadFrame) {
  NEED_OPEN_DATA(folder, "caps");
  const auto files = cap_files(folder);
  ASSERT_EQ(files.size(), 4u);
  for (const auto& file : files) {
    SCOPED_TRACE(file.filename());
    const DigitisedCap cap = read_cap(file);
    EXPECT_FALSE(cap.without_position.empty());  // eye leads and the like, n/a in every table
    EXPECT_EQ(cap.axes, "RAS");
    const CapFit fit = fit_cap(cap);
    EXPECT_GT(fit.sphere.radius, 95.5e-3);
    EXPECT_LT(fit.sphere.radius, 106.5e-3);
    EXPECT_GT(fit.sphere.rms, 2.5e-3);
    EXPECT_LT(fit.sphere.rms, 6.6e-3);
    EXPECT_EQ(fit.method, "names");
    EXPECT_FALSE(fit.mirrored);
    EXPECT_FALSE(fit.reversed);
    EXPECT_TRUE(fit.outliers.empty());
    EXPECT_TRUE(fit.notes.empty());
    // A cap put on 2 cm too far forward or back on a head of 100 mm is turned by 11.5 degrees.
    EXPECT_LT(fit.landmark_angle_deg, 12);
    RecordProperty("landmark_angle_deg", fmt::format("{:.1f}", fit.landmark_angle_deg));
  }
}

// No electrode stands nearer to the place of another one of the cap than to its own.
TEST(SignalCapFit, RealElectrodesStandNearestToTheirOwnPlace) {
  NEED_OPEN_DATA(folder, "caps");
  for (const auto& file : cap_files(folder)) {
    const Montage montage = fit_cap(read_cap(file)).montage;
    ASSERT_GE(montage.labels.size(), 60u);
    for (std::size_t i = 0; i < montage.labels.size(); ++i) {
      const Eigen::Vector3d u = montage.positions.col(static_cast<Eigen::Index>(i)).normalized();
      std::string nearest;
      double best = -1;
      for (const std::string& name : montage.labels)
        if (const auto place = standard_direction(name); place && place->dot(u) > best) {
          best = place->dot(u);
          nearest = name;
        }
      EXPECT_EQ(nearest, montage.labels[i]) << file.filename();
    }
  }
}

// By landmarks alone the same caps come out within the same angle, and the vertex is up.
TEST(SignalCapFit, RealCapsByLandmarks) {
  NEED_OPEN_DATA(folder, "caps");
  for (const auto& file : cap_files(folder)) {
    SCOPED_TRACE(file.filename());
    DigitisedCap cap = read_cap(file);
    const CapFit by_names = fit_cap(cap);
    const auto vertex = find_label(cap.electrodes.labels, "Cz");
    ASSERT_TRUE(vertex);
    for (std::string& label : cap.electrodes.labels) label = "lead " + label;
    const CapFit fit = fit_cap(cap);
    EXPECT_EQ(fit.method, "landmarks");
    EXPECT_FALSE(fit.mirrored);
    EXPECT_TRUE(std::isnan(fit.angle_rms_deg));
    const Eigen::Matrix3d difference = fit.rotation * by_names.rotation.transpose();
    EXPECT_NEAR(std::acos((difference.trace() - 1) / 2) * 180 / kPi, by_names.landmark_angle_deg,
                1e-6);
    EXPECT_GT(fit.montage.positions.col(*vertex).normalized().z(), std::cos(15 * kPi / 180));
  }
}

// The template's ring lies level; that of the standard cap is pitched by 4.4 degrees, and nothing
// else may turn it. M1, M2 and eye leads have no 10-5 name.
TEST(SignalCapFit, ATemplateCapIsOnlyPitched) {
  NEED_OPEN_DATA(folder, "novel-sounds");
  const DigitisedCap cap = read_cap(folder / "electrodes.tsv");
  const CapFit fit = fit_cap(cap);
  EXPECT_EQ(fit.method, "names");
  EXPECT_NEAR(fit.sphere.radius, 85e-3, 0.05e-3);
  EXPECT_LT(fit.sphere.centre.norm(), 0.05e-3);
  EXPECT_NEAR(fit.rotation(0, 0), 1, 1e-6);  // about x; sites are mirrored to 0.01 mm in 85
  const double pitch = std::atan2(fit.rotation(2, 1), fit.rotation(1, 1)) * 180 / kPi;
  EXPECT_NEAR(pitch, -4.4, 1);
  EXPECT_TRUE(fit.outliers.empty());
  EXPECT_EQ(fit.montage.labels.size(), 31u);
}

}  // namespace
}  // namespace headwater
