// SPDX-License-Identifier: GPL-3.0-or-later
// The truth that stands beside the invented example, in SI units.
#pragma once
#include <headwater/base/table.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/contrast.hpp>

#include <Eigen/Core>

#include <cmath>
#include <filesystem>
#include <map>
#include <string>
#include <vector>

namespace headwater {

/// A row of truth.tsv: a planted source.
struct Planted {
  Eigen::Vector3d mni_m, direction;
  double latency_s = 0, width_s = 0;
  std::map<std::string, double> moment_Am;

  /// Strength in a contrast, averaged over a window of 4 ms samples.
  double mean_strength(const std::vector<ConditionWeight>& weights, double from_s,
                       double to_s) const {
    double strength = 0, course = 0;
    for (const auto& [condition, weight] : weights) strength += weight * moment_Am.at(condition);
    const int samples = static_cast<int>(std::lround((to_s - from_s) / 0.004)) + 1;
    for (int t = 0; t < samples; ++t)
      course += std::exp(-0.5 * std::pow((from_s + 0.004 * t - latency_s) / width_s, 2)) / samples;
    return strength * course;
  }
};

inline std::map<std::string, Planted> read_truth(const std::filesystem::path& path) {
  const Table table = read_table(path, "truth");
  std::map<std::string, Planted> planted;
  for (std::size_t row = 0; row < table.rows.size(); ++row) {
    const auto triple = [&](const Labels& names) {
      Eigen::Vector3d value;
      for (int axis = 0; axis < 3; ++axis)
        value[axis] = table.number(row, table.column(names[static_cast<std::size_t>(axis)]));
      return value;
    };
    Planted source{triple({"x_mm", "y_mm", "z_mm"}) * kMillimetre,
                   triple({"direction_x", "direction_y", "direction_z"}),
                   table.number(row, table.column("latency_ms")) * kMillisecond,
                   table.number(row, table.column("width_ms")) * kMillisecond,
                   {}};
    for (const auto& column : table.columns)
      if (const auto end = column.rfind("_nAm"); end != std::string::npos)
        source.moment_Am[column.substr(0, end)] =
            table.number(row, table.column(column)) * kNanoampereMetre;
    planted[table.rows[row][table.column("name")]] = source;
  }
  return planted;
}

}  // namespace headwater
