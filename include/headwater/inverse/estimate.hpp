// SPDX-License-Identifier: GPL-3.0-or-later
// Source courses and window maps out of an operator.
#pragma once
#include <headwater/inverse/subspace.hpp>
#include <headwater/signal/time_window.hpp>

#include <Eigen/Core>

namespace headwater {

struct SourceEstimate {
  Eigen::MatrixXd
      components;  ///< 3N by T, source-major (x, y, z of point 0, ...), SI unit of the operator
  Eigen::MatrixXd amplitude;  ///< N by T, length of the three components
};

/// data_V: M by T, channels in the subspace's order, any reference.
SourceEstimate estimate_sources(const SourceOperator& inverse, const Eigen::MatrixXd& data_V);

/// The map of a window: root mean square over its samples of the amplitude, N.
Eigen::VectorXd window_map(const Eigen::MatrixXd& amplitude, const SampleRange& samples);

/// trace of the resolution matrix R = T L (3N by 3N, never formed): at most M-1 for minimum norm
/// and eLORETA. Standardised estimates and unit-gain filters (3N for vectors) are not bounded by
/// it.
double resolution_trace(const SourceOperator& inverse, const Eigen::MatrixXd& gain);

}  // namespace headwater
