// SPDX-License-Identifier: GPL-3.0-or-later
// Peaks of a window's map: points larger than all their neighbours.
#pragma once
#include <headwater/model/source_grid.hpp>
#include <headwater/signal/time_window.hpp>

#include <Eigen/Core>

#include <vector>

namespace headwater {

struct Peak {
  Eigen::Index point = 0;
  double value = 0;      ///< of the map, unit of the map
  double latency_s = 0;  ///< sample of the window with the largest amplitude at this point
};

struct PeakOptions {
  int most = 5;
  double share_of_largest = 0.5;  ///< smaller peaks are left out
};

/// neighbours: of the grid (grid_neighbours). amplitude: N by T. Largest first; ties by point
/// number.
std::vector<Peak> find_peaks(const std::vector<std::vector<Eigen::Index>>& neighbours,
                             const Eigen::VectorXd& map, const Eigen::MatrixXd& amplitude,
                             const Eigen::VectorXd& times_s, const SampleRange& samples,
                             const PeakOptions& options = {});

/// A place where a smooth inverse puts the false maximum of two symmetric generators: within 20 mm
/// of the midline, or more than 35 mm below the hull (common practice; no source).
bool may_be_merged(const SourceGrid& grid, Eigen::Index point);

}  // namespace headwater
