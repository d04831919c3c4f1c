// SPDX-License-Identifier: GPL-3.0-or-later
// Electrodes and their positions.
#pragma once
#include <headwater/base/labels.hpp>
#include <headwater/base/sphere_fit.hpp>

#include <Eigen/Core>

#include <filesystem>
#include <map>
#include <string>
#include <vector>

namespace headwater {

/// Channel names with positions in the head frame (RAS, metres, origin in the centre of the head's
/// sphere). Only directions enter the spherical model; lengths are kept for the sphere fit.
struct Montage {
  Labels labels;
  Eigen::Matrix3Xd positions;  ///< 3 by #channels, m, head frame
};

/// What the experiment file says of the channels. `drop` and `rename` use the names of the file; a
/// name of `zero` is a new channel: the recording reference, restored as zeros.
struct ChannelEdits {
  Labels drop;
  std::map<std::string, std::string> rename;  ///< from -> to
  Labels zero;
};

/// Which columns of the data make which channels: channel i is column source[i], or zeros where
/// source[i] is -1.
struct ChannelPlan {
  Labels labels;
  std::vector<Eigen::Index> source;
};

/// Applies the edits to the channel names of one file. Throws InputError, all problems in one
/// message: names to drop or rename that are not there, a name that occurs twice afterwards, fewer
/// than 8 channels left, a `zero` that is already a channel (say: drop the column first).
ChannelPlan plan_channels(const Labels& file_channels, const ChannelEdits& edits,
                          const std::string& where);

/// Frame of a positions table.
enum class PositionSpace { head, mni };

/// Reads `name x_mm y_mm z_mm`, or a BIDS electrodes.tsv (`name x y z`; the unit is
/// EEGCoordinateUnits - mm, cm or m - of the coordsystem.json beside it: the file whose name has
/// "electrodes.tsv" replaced by "coordsystem.json", plain coordsystem.json, or as BIDS' inheritance
/// allows: the nearest folder above whose file has entities of the table only). MNI positions
/// become head-frame positions by subtracting the head's centre (0, -15.4, -2.8) mm. Rows with n/a
/// positions are left out. Errors (InputError): repeated names, fewer than 4 positions, unit not
/// stated, a stated unit that the numbers contradict (fitted sphere radius outside 40 to 200 mm:
/// says which unit would make a head).
Montage read_positions(const std::filesystem::path& path, PositionSpace space);

/// Standard positions of the labels on a sphere of radius_m. Throws InputError that lists every
/// unknown name at once, with the nearest standard name, and says: rename, drop, or give a table.
Montage standard_montage(const Labels& labels, double radius_m);

/// The labels' positions out of a table, joined by name (case ignored), in the labels' order.
/// Throws InputError that lists every label without a position.
Montage select_positions(const Montage& table, const Labels& labels, const std::string& where);

/// Least-squares sphere through the positions (m), centre in the head frame.
SphereFit fit_head_sphere(const Montage& montage);

/// Neighbours of each channel: edges of the Delaunay triangulation of the directions on the sphere
/// (the rim of the cap excluded: edges longer than 60 degrees are left out).
std::vector<std::vector<Eigen::Index>> channel_neighbours(const Montage& montage);

}  // namespace headwater
