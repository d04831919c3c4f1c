// SPDX-License-Identifier: GPL-3.0-or-later
// Values on a regular lattice in MNI space, as bytes for viewers: NIfTI-1 (nifti.hpp) and VTK image
// data (vtk_grid.hpp). Both keep the voxel order x fastest, then y, then z; x grows to the right
// (RAS).
#pragma once
#include <Eigen/Core>

#include <array>
#include <string>

namespace headwater {

struct Volume {
  std::array<int, 3> size{0, 0, 0};                         ///< voxels along x, y, z
  Eigen::Matrix4d affine_mm = Eigen::Matrix4d::Identity();  ///< voxel index -> MNI mm
  Eigen::MatrixXd values;   ///< #voxels by #times (1 for a single map)
  double first_time_s = 0;  ///< of a series
  double time_step_s = 0;   ///< 0 for a single map
  std::string name;         ///< of the quantity, e.g. "amplitude"
  std::string unit;         ///< of the values, e.g. "nA m"
  std::string description;  ///< at most 79 bytes go into NIfTI
};

}  // namespace headwater
