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

/// Q = A'A of each region, A (3K by M-1) the region's rows of the operator: the power of the
/// region's points is z'Qz for z = map d. Made once; courses and indices both use them.
std::vector<Eigen::MatrixXd> region_forms(const SourceOperator& inverse,
                                          const std::vector<Region>& regions);

/// forms: of these regions. outward: 3 by N, away from the head's centre. data_V: M by T, any
/// reference. The eigenproblem of a region is as large as the rank of the data, at most M-1.
RegionCourses region_courses(const SourceOperator& inverse,
                             const std::vector<Eigen::MatrixXd>& forms,
                             const Eigen::MatrixXd& data_V, const std::vector<Region>& regions,
                             const Eigen::Matrix3Xd& outward);

}  // namespace headwater
