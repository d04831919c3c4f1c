// SPDX-License-Identifier: GPL-3.0-or-later
// NIfTI-1 volumes through nifticlib. Written: .nii.gz, float32, sform and qform code 4 (MNI), mm
// and s, 4-D for a series (pixdim[4] = time step, toffset = first time). Written values outside the
// source grid are 0. Read: any single-file NIfTI-1 of 3 or 4 dimensions; scl_slope and scl_inter
// applied (slope 0: none); the affine is the sform, or the qform where there is no sform.
#pragma once
#include <headwater/base/volume.hpp>

#include <filesystem>

namespace headwater {

/// Atomic. Throws ResourceError.
void write_nifti(const std::filesystem::path& path, const Volume& volume);

/// Throws InputError: not NIfTI, sizes that disagree with the file's length, no usable affine.
Volume read_nifti(const std::filesystem::path& path);

}  // namespace headwater
