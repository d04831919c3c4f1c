// SPDX-License-Identifier: GPL-3.0-or-later
// Invented background EEG for tests of bad leads and trials: what random dipoles in the head make
// at the electrodes, with noise of each electrode's own.
#pragma once
#include <headwater/base/random.hpp>
#include <headwater/model/head.hpp>
#include <headwater/model/lead_field.hpp>
#include <headwater/signal/electrodes.hpp>

#include <Eigen/Core>

#include <cmath>

namespace headwater {

inline const Labels& sixty_four_leads() {
  static const Labels labels{
      "Fp1", "Fpz", "Fp2", "AF7", "AF3", "AFz", "AF4", "AF8", "F7",  "F5",  "F3",  "F1",  "Fz",
      "F2",  "F4",  "F6",  "F8",  "FT7", "FC5", "FC3", "FC1", "FCz", "FC2", "FC4", "FC6", "FT8",
      "T7",  "C5",  "C3",  "C1",  "Cz",  "C2",  "C4",  "C6",  "T8",  "TP7", "CP5", "CP3", "CP1",
      "CPz", "CP2", "CP4", "CP6", "TP8", "P7",  "P5",  "P3",  "P1",  "Pz",  "P2",  "P4",  "P6",
      "P8",  "PO7", "PO3", "POz", "PO4", "PO8", "O1",  "Oz",  "O2",  "P9",  "P10", "Iz"};
  return labels;
}

inline const Labels& thirty_two_leads() {
  static const Labels labels{"Fp1", "Fp2", "AF3", "AF4", "F7",  "F3",  "Fz", "F4",
                             "F8",  "FC5", "FC1", "FC2", "FC6", "T7",  "C3", "Cz",
                             "C4",  "T8",  "CP5", "CP1", "CP2", "CP6", "P7", "P3",
                             "Pz",  "P4",  "P8",  "PO3", "PO4", "O1",  "Oz", "O2"};
  return labels;
}

/// 80 dipoles, 35 to 72 mm from the centre, z > -30 mm, of random direction, each with a course of
/// its own (first-order autoregressive: a spectrum falling as 1/f^2 above 2 Hz at 250 Hz), plus 1
/// uV of white noise at each electrode. M by (trials * samples), V, about 10 uV.
inline Eigen::MatrixXd background(const Montage& montage, Eigen::Index trials, Eigen::Index samples,
                                  RandomStream& random) {
  constexpr Eigen::Index dipoles = 80;
  Eigen::Matrix3Xd points(3, dipoles);
  for (Eigen::Index k = 0; k < dipoles; ++k) do {
      const Eigen::Vector3d way(random.normal(), random.normal(), random.normal());
      points.col(k) = (0.035 + 0.037 * random.uniform()) * way.normalized();
    } while (points(2, k) < -0.03);
  const Eigen::MatrixXd gain = compute_gain(default_head(), montage.positions, points);
  Eigen::MatrixXd maps(gain.rows(), dipoles);
  for (Eigen::Index k = 0; k < dipoles; ++k)
    maps.col(k) = gain.middleCols<3>(3 * k) *
                  Eigen::Vector3d(random.normal(), random.normal(), random.normal());
  Eigen::MatrixXd courses = random.normal_matrix(dipoles, trials * samples);
  constexpr double keep = 0.95;
  for (Eigen::Index t = 1; t < courses.cols(); ++t)
    courses.col(t) = keep * courses.col(t - 1) + std::sqrt(1 - keep * keep) * courses.col(t);
  Eigen::MatrixXd data = maps * courses;
  data *= 10e-6 / std::sqrt(data.squaredNorm() / static_cast<double>(data.size()));
  return data + 1e-6 * random.normal_matrix(data.rows(), data.cols());
}

}  // namespace headwater
