// SPDX-License-Identifier: GPL-3.0-or-later
// VTK XML image data (.vti, appended raw binary, zlib level 1) and a time index (.pvd),
// written without VTK. Format: VTK file formats, the XML section of the VTK User's Guide.
// Coordinates are MNI mm: Origin and Spacing come from the affine, which must be a positive
// diagonal plus shift.
#pragma once
#include <headwater/base/volume.hpp>

#include <filesystem>
#include <string>
#include <utility>
#include <vector>

namespace headwater {

/// One map (column `time` of volume.values) as Float32 point data named "<name> [<unit>]", with
/// field data: TimeValue (s, when a series), "space" = "MNI152 mm RAS". Atomic.
void write_vti(const std::filesystem::path& path, const Volume& volume, Eigen::Index time = 0);

/// Index of (time in s, file name relative to the index). Atomic.
void write_pvd(const std::filesystem::path& path,
               const std::vector<std::pair<double, std::string>>& steps);

}  // namespace headwater
