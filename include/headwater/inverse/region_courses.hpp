// SPDX-License-Identifier: GPL-3.0-or-later
// Time courses of regions. For the points of a region (3K by T block X of components):
//   projected  each point's course along its own direction in the region's dominant pattern - the
//   first
//              left singular vector of X, cut into 3-vectors of length 1 - averaged over the
//              points; one sign for the whole region, such that the pattern points outwards on
//              balance. Directions come from the data, so that opposite walls of a sulcus do not
//              cancel.
//   rms        root mean square over the points of the amplitude: cannot cancel.
#pragma once
#include <headwater/inverse/estimate.hpp>
#include <headwater/model/regions.hpp>

#include <Eigen/Core>

#include <vector>

namespace headwater {

struct RegionCourses {
  Eigen::MatrixXd projected;  ///< #regions by T, unit of the estimate
  Eigen::MatrixXd rms;        ///< #regions by T, same unit
  Eigen::VectorXd share;      ///< #regions: variance of X in the dominant pattern, 0 to 1
};

/// outward: 3 by N, away from the head's centre. data_V: what the estimate was made from (its rank
/// bounds the work: the singular vectors come from a (M-1)-square eigenproblem for each region).
RegionCourses region_courses(const SourceOperator& inverse, const SourceEstimate& estimate,
                             const Eigen::MatrixXd& data_V, const std::vector<Region>& regions,
                             const Eigen::Matrix3Xd& outward);

}  // namespace headwater
