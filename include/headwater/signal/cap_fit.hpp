// SPDX-License-Identifier: GPL-3.0-or-later
// A digitised cap in the head frame.
//
// Steps: unit (a stated unit that the numbers contradict - sphere radius outside 60 to 140 mm - is
// replaced by the one that makes a head, and that is said); sphere through the electrodes with
// outliers left out (an electrode far off the sphere does not pull it); origin at the centre;
// rotation, which is rigid (no scaling, no reflection):
//   names      least squares of the directions on those of the standard cap (Kabsch 1976 Acta Cryst
//              A32:922), over electrodes with a 10-5 name, outliers out: used when at least 8 have
//              one
//   landmarks  nasion and both preauricular points: x along LPA to RPA, y towards the nasion, then
//              pitched about x so that the nasion's direction from the sphere's centre has the
//              template's elevation; used when names are too few, and otherwise as a check of them
//   axes       where there are neither: the axes that the coordinate system states (RAS, ALS, ...)
// The rotation by names is taken twice, with and without reflection: a cap with left and right
// exchanged fits its mirror image far better. What was exchanged is told by the landmarks, or else
// by the stated axes: the nasion by more than 120 degrees about z from the front of the names
// (reversed), or the right ear on the left of the names. A mirrored cap comes out with its
// exchanged names where they were digitised; its outliers are those besides the exchange.
#pragma once
#include <headwater/base/sphere_fit.hpp>
#include <headwater/signal/electrodes.hpp>

#include <Eigen/Core>

#include <filesystem>
#include <optional>
#include <string>
#include <vector>

namespace headwater {

/// A cap as it was digitised, in its own frame, m.
struct DigitisedCap {
  Montage electrodes;
  Labels without_position;  ///< n/a in the table
  std::optional<Eigen::Vector3d> nasion, left_ear, right_ear;
  std::string coordinate_system;  ///< EEGCoordinateSystem or ""
  std::string axes;  ///< such as "RAS" (x right, y anterior, z superior) where it is stated, or ""
  std::string source;
  Labels notes;  ///< unit replaced, ...
};

/// BIDS electrodes.tsv with its coordsystem.json (the file's own name with "electrodes.tsv"
/// replaced, else coordsystem.json, else as BIDS' inheritance allows), or name x_mm y_mm z_mm.
/// Landmarks: AnatomicalLandmarkCoordinates or FiducialsCoordinates under NAS/Nz/Nasion, LPA, RPA;
/// rows of those names in the table count as landmarks, not as electrodes. Errors (InputError) as
/// read_positions, but a contradicted unit is mended and noted.
DigitisedCap read_cap(const std::filesystem::path& path);

struct CapFit {
  Montage montage;     ///< head frame, m; all electrodes of the cap, landmarks left out
  SphereFit sphere;    ///< in the cap's own frame; residual of all, rms without those left out
  std::string method;  ///< "names", "landmarks", "stated axes"
  Eigen::Matrix3d rotation = Eigen::Matrix3d::Identity();  ///< cap's frame to head frame
  double angle_rms_deg = 0;       ///< of directions against the standard cap; NaN without names
  double landmark_angle_deg = 0;  ///< between the rotations by names and by landmarks; NaN
  bool mirrored = false;          ///< left and right seem exchanged (not mended: an error to users)
  bool reversed = false;          ///< nasion and inion seem exchanged
  /// Electrodes far from where their name belongs (more than 25 degrees) or off the sphere (more
  /// than 5 robust spreads and 15 mm), with the figures.
  struct Outlier {
    std::string name;
    double angle_deg, off_sphere_m;
  };
  std::vector<Outlier> outliers;
  Labels notes;
};

/// Throws InputError: fewer than 4 electrodes, a sphere of radius outside 60 to 140 mm, too few
/// names and no landmarks and no coordinate system of stated RAS axes.
CapFit fit_cap(const DigitisedCap& cap);

}  // namespace headwater
