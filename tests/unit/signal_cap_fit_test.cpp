// SPDX-License-Identifier: GPL-3.0-or-later
#include "base_scratch.hpp"
#include "cap_support.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/units.hpp>

#include <fmt/core.h>
#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <tuple>
#include <utility>

namespace headwater {
namespace {

namespace fs = std::filesystem;

const Labels kTen{"Fp1", "Fp2", "F7", "Fz", "F8", "C3", "Cz", "C4", "O1", "O2"};

std::string table_text(const DigitisedCap& cap, double per_metre) {
  std::string text = "name\tx\ty\tz\n";
  for (std::size_t i = 0; i < cap.electrodes.labels.size(); ++i) {
    const Eigen::Vector3d p =
        per_metre * cap.electrodes.positions.col(static_cast<Eigen::Index>(i));
    text += fmt::format("{}\t{:.12g}\t{:.12g}\t{:.12g}\n", cap.electrodes.labels[i], p.x(), p.y(),
                        p.z());
  }
  return text;
}

std::string point_text(const Eigen::Vector3d& p, double per_metre) {
  return fmt::format("[{:.12g}, {:.12g}, {:.12g}]", p.x() * per_metre, p.y() * per_metre,
                     p.z() * per_metre);
}

/// Members of a side file that give the cap's landmarks.
std::string landmark_text(const DigitisedCap& cap, const std::string& key, double per_metre) {
  return fmt::format(R"(, "{}Coordinates": {{"NAS": {}, "LPA": {}, "RPA": {}}})", key,
                     point_text(*cap.nasion, per_metre), point_text(*cap.left_ear, per_metre),
                     point_text(*cap.right_ear, per_metre));
}

/// A table in m with a side file of these members.
DigitisedCap read_with(const DigitisedCap& cap, const std::string& members, double per_metre = 1) {
  const Scratch scratch;
  write_file(scratch.folder / "electrodes.tsv", table_text(cap, per_metre));
  write_file(scratch.folder / "coordsystem.json", "{" + members + "}");
  return read_cap(scratch.folder / "electrodes.tsv");
}

bool says(const Labels& notes, const std::string& words) {
  return std::any_of(notes.begin(), notes.end(), [&](const std::string& note) {
    return note.find(words) != std::string::npos;
  });
}

TEST(SignalCapFit, ReadsElectrodesLandmarksAndAxes) {
  const DigitisedCap cap = standard_cap(kTen);
  const Scratch scratch;
  const auto path = scratch.folder / "sub-01_electrodes.tsv";
  write_file(path, "\xef\xbb\xbf" + table_text(cap, 1e3) + "VEOG\tn/a\tn/a\tn/a\n");
  write_file(scratch.folder / "sub-01_coordsystem.json",
             R"({"EEGCoordinateUnits": "mm", "EEGCoordinateSystem": "Other",
                 "EEGCoordinateSystemDescription": "a \"RAS\" orientation",
                 "AnatomicalLandmarkCoordinateUnits": "cm")" +
                 landmark_text(cap, "AnatomicalLandmark", 1e2) + "}");
  const DigitisedCap read = read_cap(path);
  EXPECT_EQ(read.electrodes.labels, kTen);
  EXPECT_LT((read.electrodes.positions - cap.electrodes.positions).cwiseAbs().maxCoeff(), 1e-12);
  EXPECT_EQ(read.without_position, Labels{"VEOG"});
  ASSERT_TRUE(read.nasion && read.left_ear && read.right_ear);
  EXPECT_LT((*read.nasion - *cap.nasion).norm(), 1e-12);
  EXPECT_LT((*read.left_ear - *cap.left_ear).norm(), 1e-12);
  EXPECT_LT((*read.right_ear - *cap.right_ear).norm(), 1e-12);
  EXPECT_EQ(read.coordinate_system, "Other");
  EXPECT_EQ(read.axes, "RAS");
  EXPECT_TRUE(read.notes.empty());
}

TEST(SignalCapFit, LandmarksInTheTableAreNoElectrodes) {
  DigitisedCap cap = standard_cap(kTen);
  const Scratch scratch;
  const auto path = scratch.folder / "cap.tsv";
  write_file(path, "name\tx_mm\ty_mm\tz_mm\nlpa\t-85\t-4\t-45\nNz\t0\t99.4\t-39.2\n" +
                       table_text(cap, 1e3).substr(std::string("name\tx\ty\tz\n").size()) +
                       "RPA\t85\t-4\t-45\n");
  const DigitisedCap read = read_cap(path);
  EXPECT_EQ(read.electrodes.labels, kTen);
  ASSERT_TRUE(read.nasion && read.left_ear && read.right_ear);
  EXPECT_LT((*read.nasion - *cap.nasion).norm(), 1e-12);
  EXPECT_LT((*read.right_ear - *cap.right_ear).norm(), 1e-12);
  EXPECT_LT(fit_cap(read).angle_rms_deg, 1e-9);
}

TEST(SignalCapFit, AContradictedUnitIsMendedAndSaid) {
  const DigitisedCap cap = standard_cap(kTen);
  for (const auto& [stated, per_metre] :
       {std::pair{"mm", 1.0}, {"mm", 1e2}, {"cm", 1e3}, {"m", 1e3}, {"m", 1e2}, {"cm", 1.0}}) {
    // The landmarks state the same wrong unit.
    const DigitisedCap read =
        read_with(cap,
                  fmt::format(R"("EEGCoordinateUnits": "{}", "FiducialsCoordinateUnits": "{}")",
                              stated, stated) +
                      landmark_text(cap, "Fiducials", per_metre),
                  per_metre);
    EXPECT_LT((read.electrodes.positions - cap.electrodes.positions).cwiseAbs().maxCoeff(), 1e-12);
    ASSERT_TRUE(read.nasion);
    EXPECT_LT((*read.nasion - *cap.nasion).norm(), 1e-12);
    EXPECT_EQ(read.notes.size(), 2u);
    EXPECT_TRUE(says(read.notes, fmt::format("stated unit of the electrodes is {}", stated)));
    EXPECT_TRUE(says(read.notes, "radius 97 mm"));
    EXPECT_TRUE(says(fit_cap(read).notes, "stated unit"));
  }
}

TEST(SignalCapFit, LandmarksOfAnotherFrameAreLeftOut) {
  const DigitisedCap cap = standard_cap(kTen);
  const std::string unit = R"("EEGCoordinateUnits": "m", "EEGCoordinateSystem": "Other")";
  const DigitisedCap other =
      read_with(cap, unit + R"(, "AnatomicalLandmarkCoordinateSystem": "scanner")" +
                         landmark_text(cap, "AnatomicalLandmark", 1));
  EXPECT_FALSE(other.nasion);
  EXPECT_TRUE(says(other.notes, "'scanner'"));
  const DigitisedCap far = read_with(cap, unit + landmark_text(cap, "AnatomicalLandmark", 4));
  EXPECT_FALSE(far.nasion);
  EXPECT_TRUE(says(far.notes, "in no unit"));
  // n/a in one kind, the other kind is taken.
  const DigitisedCap second =
      read_with(cap, unit + R"(, "AnatomicalLandmarkCoordinates": {"NAS": "n/a", "LPA": [1, 2]})" +
                         landmark_text(cap, "Fiducials", 1));
  ASSERT_TRUE(second.nasion);
  EXPECT_LT((*second.nasion - *cap.nasion).norm(), 1e-12);
}

TEST(SignalCapFit, AxesAreThoseStatedOnce) {
  const auto axes = [](const std::string& description) {
    return read_with(standard_cap(kTen),
                     R"("EEGCoordinateUnits": "m", "EEGCoordinateSystemDescription": ")" +
                         description + "\"")
        .axes;
  };
  EXPECT_EQ(axes("x to the nose: ALS. Again (ALS)"), "ALS");
  EXPECT_EQ(axes("RAS, not ALS"), "");
  EXPECT_EQ(axes("RASTER, RRS, ras"), "");
  EXPECT_EQ(axes(""), "");
}

TEST(SignalCapFit, SideFilesAreInherited) {
  const DigitisedCap cap = standard_cap(kTen);
  const Scratch scratch;
  const fs::path eeg = scratch.folder / "sub-01" / "ses-2" / "eeg";
  fs::create_directories(eeg);
  const auto path = eeg / "sub-01_ses-2_space-x_electrodes.tsv";
  write_file(path, table_text(cap, 1e3));
  const auto system = [&](const fs::path& side, const std::string& name) {
    write_file(side,
               fmt::format(R"({{"EEGCoordinateUnits": "mm", "EEGCoordinateSystem": "{}"}})", name));
    return read_cap(path).coordinate_system;
  };
  EXPECT_EQ(system(scratch.folder / "coordsystem.json", "root"), "root");
  EXPECT_EQ(system(scratch.folder / "space-x_coordsystem.json", "space"), "space");
  EXPECT_EQ(system(scratch.folder / "space-y_coordsystem.json", "other space"), "space");
  EXPECT_EQ(system(scratch.folder / "sub-01" / "sub-01_coordsystem.json", "person"), "person");
  EXPECT_EQ(system(scratch.folder / "sub-01" / "sub-02_coordsystem.json", "no"), "person");
  EXPECT_EQ(system(eeg / "coordsystem.json", "plain"), "plain");
  EXPECT_EQ(system(eeg / "sub-01_ses-2_space-x_coordsystem.json", "own"), "own");
}

TEST(SignalCapFit, TellsWhatWasExchanged) {
  struct Case {
    const char* what;
    bool names_x, names_y, all_x, ears, nasion;
    bool mirrored, reversed;
  };
  const Case cases[] = {
      {"nothing", false, false, false, false, false, false, false},
      {"axes mirrored", false, false, true, false, false, true, false},
      {"names left and right", true, false, false, false, false, true, false},
      {"ears", false, false, false, true, false, true, false},
      {"names and axes", true, false, true, false, false, true, false},
      {"nasion and inion", false, false, false, false, true, false, true},
      {"turned by half", true, true, false, false, false, false, true},
      {"names front and back", false, true, false, false, false, false, true},
      {"turned, axes mirrored", true, true, true, false, false, true, true},
  };
  for (const Case& one : cases) {
    DigitisedCap cap = standard_cap(kSixtyFour);
    if (one.names_x) cap.electrodes.positions.row(0) *= -1;
    if (one.names_y) cap.electrodes.positions.row(1) *= -1;
    if (one.ears) std::swap(cap.left_ear, cap.right_ear);
    if (one.nasion) cap.nasion->y() *= -1;
    if (one.all_x) {
      cap.electrodes.positions.row(0) *= -1;
      for (auto* landmark : {&cap.nasion, &cap.left_ear, &cap.right_ear}) (*landmark)->x() *= -1;
    }
    move(cap, Motion());
    const CapFit fit = fit_cap(cap);
    EXPECT_EQ(fit.mirrored, one.mirrored) << one.what;
    EXPECT_EQ(fit.reversed, one.reversed) << one.what;
    EXPECT_EQ(says(fit.notes, "left and right seem exchanged"), one.mirrored) << one.what;
    EXPECT_EQ(says(fit.notes, "front and back"), one.reversed) << one.what;
    EXPECT_NEAR(fit.rotation.determinant(), 1, 1e-12) << one.what;
    EXPECT_TRUE(fit.outliers.empty()) << one.what;
  }
}

TEST(SignalCapFit, ACapMirroredInItsNamesStandsInItsTruePose) {
  DigitisedCap cap = standard_cap(kSixtyFour);
  cap.electrodes.positions.row(0) *= -1;
  const Eigen::Matrix3Xd truth = cap.electrodes.positions;
  move(cap, Motion());
  EXPECT_LT((fit_cap(cap).montage.positions - truth).cwiseAbs().maxCoeff(), 1e-12);
  cap.nasion.reset();  // the chirality alone tells
  EXPECT_TRUE(fit_cap(cap).mirrored);
}

TEST(SignalCapFit, StatedAxesTellTheFrontWithoutLandmarks) {
  DigitisedCap cap = standard_cap(kSixtyFour);
  cap.nasion.reset();
  cap.electrodes.positions.topRows(2) *= -1;
  EXPECT_FALSE(fit_cap(cap).reversed);  // nothing says where the front is
  cap.axes = "RAS";
  const CapFit fit = fit_cap(cap);
  EXPECT_TRUE(fit.reversed);
  EXPECT_FALSE(fit.mirrored);
}

TEST(SignalCapFit, ExchangedLabelsAreNamedAndDoNotPull) {
  for (const auto& [a, b, far] : {std::tuple{"C3", "C4", true},
                                  {"F3", "P4", true},
                                  {"F3", "F1", false}}) {  // the last two are 17 degrees apart
    DigitisedCap cap = standard_cap(kSixtyFour);
    const Eigen::Index i = *find_label(kSixtyFour, a), j = *find_label(kSixtyFour, b);
    cap.electrodes.positions.col(i).swap(cap.electrodes.positions.col(j));
    const Motion motion;
    move(cap, motion);
    const CapFit fit = fit_cap(cap);
    EXPECT_LT((fit.rotation - motion.rotation.transpose()).norm(), 1e-12) << a << b;
    Labels named;
    for (const CapFit::Outlier& outlier : fit.outliers) {
      named.push_back(outlier.name);
      EXPECT_NEAR(outlier.angle_deg,
                  180 / kPi * std::acos(standard_direction(a)->dot(*standard_direction(b))), 1e-9);
      EXPECT_NEAR(outlier.off_sphere_m, 0, 1e-12);
    }
    std::sort(named.begin(), named.end());
    EXPECT_EQ(named, far ? (Labels{a, b}) : Labels()) << a << b;
  }
}

// Threes of labels moved on by one place pull, unlike two exchanged; 30 of 64 are wrong here.
TEST(SignalCapFit, ManyWrongLabelsAreNamedAndDoNotPull) {
  DigitisedCap cap = standard_cap(kSixtyFour);
  const Eigen::Matrix3Xd truth = cap.electrodes.positions;
  for (Eigen::Index k = 0; k < 10; ++k) {
    cap.electrodes.positions.col(k) = truth.col(k + 20);
    cap.electrodes.positions.col(k + 20) = truth.col(k + 40);
    cap.electrodes.positions.col(k + 40) = truth.col(k);
  }
  const Motion motion;
  move(cap, motion);
  const CapFit fit = fit_cap(cap);
  EXPECT_LT((fit.rotation - motion.rotation.transpose()).norm(), 1e-12);
  EXPECT_EQ(fit.outliers.size(), 30u);
  EXPECT_FALSE(fit.mirrored || fit.reversed);
}

TEST(SignalCapFit, ElectrodesOffTheSphereAreNamedAndDoNotPull) {
  for (const double factor : {0.3, 0.8, 1.2, 30.0}) {
    DigitisedCap cap = standard_cap(kSixtyFour);
    cap.electrodes.positions.col(3) *= factor;
    cap.electrodes.positions.col(40) *= factor;
    const Motion motion;
    move(cap, motion);
    const CapFit fit = fit_cap(cap);
    EXPECT_LT((fit.sphere.centre - motion.shift).norm(), 1e-12) << factor;
    EXPECT_NEAR(fit.sphere.radius, kCapRadius, 1e-12) << factor;
    EXPECT_LT(fit.sphere.rms, 1e-12) << factor;
    ASSERT_EQ(fit.outliers.size(), 2u) << factor;
    EXPECT_EQ(fit.outliers[0].name, kSixtyFour[3]);
    EXPECT_EQ(fit.outliers[1].name, kSixtyFour[40]);
    for (const CapFit::Outlier& outlier : fit.outliers)
      EXPECT_NEAR(outlier.off_sphere_m, (factor - 1) * kCapRadius, 1e-12);
  }
}

TEST(SignalCapFit, StatedAxesTurnACapWithoutNames) {
  DigitisedCap cap = standard_cap(kSixtyFour);
  const Eigen::Matrix3Xd truth = cap.electrodes.positions;
  cap.left_ear.reset();
  rename_all(cap);
  cap.electrodes.positions.row(0) = truth.row(1);  // anterior, left, superior
  cap.electrodes.positions.row(1) = -truth.row(0);
  cap.electrodes.positions.row(2) = truth.row(2);
  cap.axes = "ALS";
  const CapFit fit = fit_cap(cap);
  EXPECT_EQ(fit.method, "stated axes");
  EXPECT_LT((fit.montage.positions - truth).cwiseAbs().maxCoeff(), 1e-12);
  EXPECT_TRUE(std::isnan(fit.angle_rms_deg));
  EXPECT_TRUE(std::isnan(fit.landmark_angle_deg));
}

TEST(SignalCapFit, LandmarksBelowWhichNoCapCanLie) {
  DigitisedCap cap = standard_cap(kSixtyFour);
  rename_all(cap);
  EXPECT_FALSE(fit_cap(cap).mirrored);
  std::swap(cap.left_ear, cap.right_ear);
  const CapFit fit = fit_cap(cap);
  EXPECT_EQ(fit.method, "landmarks");
  EXPECT_TRUE(fit.mirrored);
  EXPECT_TRUE(says(fit.notes, "below the plane of the landmarks"));
}

}  // namespace
}  // namespace headwater
