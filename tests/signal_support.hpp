// SPDX-License-Identifier: GPL-3.0-or-later
// What tests of the signal wing share: invented averages, and the open recordings where present.
#pragma once
#include <headwater/base/random.hpp>
#include <headwater/signal/average.hpp>

#include <Eigen/Core>
#include <fmt/core.h>

#include <algorithm>
#include <cmath>
#include <cstdlib>
#include <filesystem>
#include <string>
#include <vector>

namespace headwater {

inline Labels numbered_channels(Eigen::Index count) {
  Labels labels;
  for (Eigen::Index i = 0; i < count; ++i) labels.push_back(fmt::format("E{}", i + 1));
  return labels;
}

/// Covariance of full rank with eigenvalues spread over about two decades, V^2.
inline Eigen::MatrixXd invented_covariance(Eigen::Index channels) {
  RandomStream random(11, "invented covariance");
  Eigen::MatrixXd mixing = random.normal_matrix(channels, channels);
  for (Eigen::Index j = 0; j < channels; ++j) mixing.col(j) /= 1 + static_cast<double>(j);
  Eigen::MatrixXd covariance = mixing * mixing.transpose();
  covariance.diagonal().array() += 0.05;
  return 1e-10 * covariance;
}

/// Averages that are noise only: at each sample factor * N(0, I) / sqrt(trials). Times from_s on, 4
/// ms apart.
inline std::vector<Average> noise_averages(RandomStream& random, const Eigen::MatrixXd& factor,
                                           const std::vector<double>& trials, Eigen::Index samples,
                                           double from_s) {
  std::vector<Average> averages;
  for (std::size_t k = 0; k < trials.size(); ++k) {
    Average average;
    average.condition = fmt::format("condition{}", k);
    average.channels = numbered_channels(factor.rows());
    average.times_s = Eigen::VectorXd::LinSpaced(samples, from_s,
                                                 from_s + 4e-3 * static_cast<double>(samples - 1));
    average.trials = trials[k];
    average.data_V = factor * random.normal_matrix(factor.cols(), samples) / std::sqrt(trials[k]);
    averages.push_back(average);
  }
  return averages;
}

inline std::filesystem::path open_data() {
  const char* folder = std::getenv("HEADWATER_OPEN_DATA");
  return folder ? folder : HEADWATER_OPEN_DATA_DEFAULT;
}

/// Names the folder of a set of open recordings, or skips the test where it is absent.
#define NEED_OPEN_DATA(variable, name)                                                    \
  const std::filesystem::path variable = std::filesystem::absolute(open_data()) / (name); \
  if (!std::filesystem::exists(variable))                                                 \
  GTEST_SKIP() << "the open recordings '" << (name) << "' are not here (HEADWATER_OPEN_DATA)"

/// Edits that make sense of the two sets of averages, see the source notes in the open-data tests.
inline ChannelEdits novel_sounds_edits() {
  return {{"IO1", "LO1", "LO2"}, {}, {}};
}
inline ChannelEdits pictures_edits() {
  return {{"X", "Y", "nd", "CZ"},
          {{"AF1", "AF3"}, {"AF2", "AF4"}, {"PO1", "PO3"}, {"PO2", "PO4"}},
          {"Cz"}};
}

/// Files "sub-*_<condition>.tsv" of a folder, sorted.
inline std::vector<std::filesystem::path> average_files(const std::filesystem::path& folder,
                                                        const std::string& condition) {
  std::vector<std::filesystem::path> files;
  if (!std::filesystem::exists(folder)) return files;
  for (const auto& entry : std::filesystem::directory_iterator(folder)) {
    const std::string name = entry.path().filename().string();
    if (name.starts_with("sub-") && name.ends_with("_" + condition + ".tsv"))
      files.push_back(entry.path());
  }
  std::sort(files.begin(), files.end());
  return files;
}

}  // namespace headwater
