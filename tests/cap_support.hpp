// SPDX-License-Identifier: GPL-3.0-or-later
// Caps made of the standard directions, moved to a frame of their own.
#pragma once
#include <headwater/signal/cap_fit.hpp>
#include <headwater/signal/standard_cap.hpp>

#include <Eigen/Geometry>

#include <cmath>
#include <string>

namespace headwater {

inline constexpr double kCapRadius = 0.097;

/// Names of a 64-lead cap.
inline const Labels kSixtyFour{
    "Fp1", "Fpz", "Fp2", "AF7", "AF3", "AFz", "AF4", "AF8", "F7",  "F5",  "F3",   "F1",  "Fz",
    "F2",  "F4",  "F6",  "F8",  "FT7", "FC5", "FC3", "FC1", "FCz", "FC2", "FC4",  "FC6", "FT8",
    "T7",  "C5",  "C3",  "C1",  "Cz",  "C2",  "C4",  "C6",  "T8",  "TP7", "CP5",  "CP3", "CP1",
    "CPz", "CP2", "CP4", "CP6", "TP8", "P7",  "P5",  "P3",  "P1",  "Pz",  "P2",   "P4",  "P6",
    "P8",  "PO7", "PO3", "POz", "PO4", "PO8", "O1",  "Oz",  "O2",  "FT9", "FT10", "TP9"};

/// In the head frame: electrodes on the sphere, nasion and ears where the template has them about
/// (templates/README.md), the nasion at its elevation exactly.
inline DigitisedCap standard_cap(const Labels& names) {
  DigitisedCap cap;
  cap.source = "cap";
  cap.electrodes = standard_montage(names, kCapRadius);
  cap.nasion = Eigen::Vector3d(0, 99.4e-3, -39.2e-3);
  cap.left_ear = Eigen::Vector3d(-85e-3, -4e-3, -45e-3);
  cap.right_ear = Eigen::Vector3d(85e-3, -4e-3, -45e-3);
  return cap;
}

/// What leads from the head frame to the cap's.
struct Motion {
  Eigen::Matrix3d rotation =
      Eigen::AngleAxisd(2.1, Eigen::Vector3d(0.3, -1, 0.7).normalized()).toRotationMatrix();
  Eigen::Vector3d shift{0.031, -0.047, 0.112};
};

inline void move(DigitisedCap& cap, const Motion& motion) {
  cap.electrodes.positions =
      ((motion.rotation * cap.electrodes.positions).colwise() + motion.shift).eval();
  for (auto* landmark : {&cap.nasion, &cap.left_ear, &cap.right_ear})
    if (*landmark) *landmark = (motion.rotation * **landmark + motion.shift).eval();
}

/// Names that no system knows, so that only landmarks can tell the pose.
inline void rename_all(DigitisedCap& cap) {
  for (std::size_t i = 0; i < cap.electrodes.labels.size(); ++i)
    cap.electrodes.labels[i] = "E" + std::to_string(i + 1);
}

}  // namespace headwater
