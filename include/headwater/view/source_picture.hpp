// SPDX-License-Identifier: GPL-3.0-or-later
// One picture of a source map: the template brain from four sides with the map on it, the peaks
// marked, and the scalp map of the same window, drawn without a display. The drawing code (VTK,
// Mesa's software renderer) is a module that is loaded on first use, so that commands that draw
// nothing stay light.
#pragma once
#include <headwater/base/labels.hpp>

#include <Eigen/Core>

#include <filesystem>
#include <string>
#include <vector>

namespace headwater {

/// A place to be marked on the brain, e.g. a peak or one half of a mirrored pair.
struct PictureMark {
  Eigen::Vector3d mni_mm = Eigen::Vector3d::Zero();
  std::string label;    ///< short: "A", "B"; drawn beside the mark
  std::string caption;  ///< for the list below the brain: "A  left HG  -52 -18 8 mm, 96 ms"
  bool pair = false;    ///< half of a mirrored pair: drawn in another shape
};

struct SourcePicture {
  std::string title;               ///< "novel minus standard, 110 to 150 ms"
  std::string subtitle;            ///< participant, method, regularisation
  Eigen::Matrix3Xd points_mni_mm;  ///< 3 by #points
  Eigen::VectorXd values;          ///< #points, non-negative
  double spacing_mm = 7;           ///< of the source lattice
  std::string value_name;          ///< "standardised amplitude"
  std::string unit;                ///< "nA m"; may be empty
  std::vector<PictureMark> marks;
  Labels channels;                 ///< of the scalp map
  Eigen::Matrix3Xd directions;     ///< 3 by #channels, head frame, any length
  Eigen::VectorXd scalp_uV;        ///< #channels, average reference
  std::vector<std::string> notes;  ///< lines printed small at the bottom: limits, cautions
  int width_px = 2000;
};

/// Writes a PNG (atomically). Same input, same bytes. Throws ResourceError when no renderer can be
/// had (says which packages: libegl1, fonts-dejavu-core) or the file cannot be written.
void write_source_picture(const std::filesystem::path& path, const SourcePicture& picture);

}  // namespace headwater
