// SPDX-License-Identifier: GPL-3.0-or-later
// Source courses computed from nothing but what stands in the results folder (files.courses =
// true), by the plain formulas of the reference inverses.
#pragma once
#include "reference/inverses.hpp"
#include "results_compare.hpp"

#include <headwater/base/json.hpp>
#include <headwater/model/lead_field.hpp>
#include <headwater/signal/reference.hpp>

namespace headwater {

struct Outside {
  Eigen::MatrixXd basis, gain, noise_V2, data_V;  ///< gain: of all channels, no reference
  Eigen::Matrix3Xd electrodes_m, head_m;
  double lambda = 0, effective_trials = 0;

  Eigen::MatrixXd subspace_gain() const { return basis.transpose() * gain; }
  Eigen::MatrixXd subspace_noise() const { return basis.transpose() * noise_V2 * basis; }
};

inline Outside read_outside(const std::filesystem::path& results, const std::string& person,
                            const std::string& contrast, const std::string& method) {
  const std::string start = person + "/" + person + "_contrast-" + contrast;
  const Numbers electrodes = read_numbers(results / "electrodes.tsv");
  const Numbers points = read_numbers(results / "points.tsv");
  const Numbers noise = read_numbers(results / (start + "_noise.tsv"));
  const Numbers waveform = read_numbers(results / (start + "_waveform.tsv"));
  const Json fit =
      read_json(results / (start + "_method-" + file_label(method) + "_fit.json"), "fit");
  EXPECT_EQ(waveform.columns, electrodes.names);
  EXPECT_EQ(noise.columns, electrodes.names);
  EXPECT_EQ(noise.names, electrodes.names);
  Outside outside;
  outside.basis = reference_free_basis(electrodes.values.rows());
  outside.head_m = points.values.transpose() * kMillimetre;
  outside.electrodes_m = electrodes.values.transpose() * kMillimetre;
  outside.gain = compute_gain(default_head(), outside.electrodes_m, outside.head_m);
  outside.noise_V2 = noise.values * kMicrovolt * kMicrovolt;
  outside.data_V = waveform.values.transpose() * kMicrovolt;
  outside.lambda = fit.find("Regularisation")->find("Lambda")->number();
  outside.effective_trials = fit.find("EffectiveTrials")->number();
  return outside;
}

/// Rows: times, columns: components of the points, in the table's unit (nA m).
inline Eigen::MatrixXd outside_courses(const Outside& outside, const std::string& method) {
  const Eigen::MatrixXd k = outside.subspace_gain(), c = outside.subspace_noise();
  const Eigen::MatrixXd inverse = method == "sloreta"
                                      ? reference::sloreta(k, c, outside.lambda)
                                      : reference::minimum_norm(k, c, outside.lambda, 0.8);
  return (inverse * (outside.basis.transpose() * outside.data_V)).transpose() / kNanoampereMetre;
}

}  // namespace headwater
