// SPDX-License-Identifier: GPL-3.0-or-later
// Gyri, lobes and sides of source points, and the regions that are averaged over.
//
// A point belongs to the gyrus of its nearest landmark on its own side (x < 0 left, x > 0 right; x
// = 0 is the midline: it gets the gyrus and the side "midline"). Agreement of that rule with
// measured label volumes: gyrus 0.76, lobe 0.94: claims belong at the level of lobes and broad
// groups of gyri. Source: templates/gyri.tsv and templates/README.md. Brodmann areas are customary
// (textbook), not measured.
#pragma once
#include <headwater/base/labels.hpp>
#include <headwater/model/source_grid.hpp>

#include <Eigen/Core>

#include <filesystem>
#include <string>
#include <vector>

namespace headwater {

struct Gyrus {
  std::string abbreviation;  ///< "STG"
  std::string name;          ///< "superior temporal gyrus"
  std::string lobe;          ///< "temporal"; "n/a" where the user's atlas does not say
  std::string brodmann;      ///< "22"; "n/a" where not known
};

enum class Side { left, right, midline };
std::string side_name(Side side);
Side side_of(double x_m);

/// Gyrus and side of every point of a grid. gyrus[p] = -1: outside the user's labels.
struct PointLabels {
  std::vector<Gyrus> gyri;
  std::vector<int> gyrus;
  std::vector<Side> side;
  std::string source;  ///< sentence for the report
};

PointLabels template_labels(const SourceGrid& grid);

/// The user's own atlas: a NIfTI label volume in MNI space and a BIDS dseg table (index, name, and
/// optionally abbreviation, lobe, brodmann). A point takes the label of its nearest voxel. Throws
/// InputError: labels in the volume that the table lacks (listed), no point inside any label.
PointLabels atlas_labels(const SourceGrid& grid, const std::filesystem::path& volume,
                         const std::filesystem::path& table);

/// The gyrus of the template's nearest landmark at an MNI place (m).
Gyrus template_gyrus(const Eigen::Vector3d& mni_m);

/// Abbreviations of the template's gyri with a landmark within a distance (m) of an MNI place on
/// its side, nearest first.
Labels nearby_gyri(const Eigen::Vector3d& mni_m, double distance_m);

/// Which points make a region.
struct Region {
  std::string name;  ///< "temporal right"
  std::vector<Eigen::Index> points;
  std::string lobe;           ///< when the region is a lobe, else empty
  Side side = Side::midline;  ///< midline: not of one side
};

/// Lobes by side, in the order of the gyri table; midline points belong to none.
std::vector<Region> lobe_regions(const PointLabels& labels);

struct RegionRequest {
  std::string name;
  Labels gyri;       ///< abbreviations or names; empty with a lobe
  std::string lobe;  ///< empty with gyri
  std::string side;  ///< "left", "right" or "" (both and midline)
};

/// Throws ExperimentError that lists unknown gyri and lobes (with suggestions) and empty regions.
std::vector<Region> requested_regions(const PointLabels& labels,
                                      const std::vector<RegionRequest>& requests);

}  // namespace headwater
