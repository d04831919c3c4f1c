// SPDX-License-Identifier: GPL-3.0-or-later
// What several tables say of a source point or of the regions of a window.
#pragma once
#include <headwater/app/results_folder.hpp>

#include <initializer_list>
#include <string>
#include <vector>

namespace headwater {

using Row = std::vector<std::string>;

std::string mm(double metres);      ///< "12.3"
std::string ms(double seconds);     ///< "96.0"
std::string percent(double share);  ///< 0.123 -> "12.3"
void append(Row& row, std::initializer_list<std::string> cells);

/// side, gyrus, lobe, brodmann of a source point.
struct Place {
  std::string side, gyrus, lobe, brodmann;
};
Place place_of(const ForwardModel& forward, Eigen::Index point);

/// Columns x_mm ... depth_mm of a source point, with `before` and `after` around them.
std::vector<ColumnInfo> with_place_columns(std::vector<ColumnInfo> before,
                                           const std::vector<ColumnInfo>& after = {});
void append_place(Row& row, const ForwardModel& forward, Eigen::Index point);

/// Regions of a window: those near the surface first, by falling rms, then the deep ones. A deep
/// region - its median point more than 25 mm below the hull (common practice; no source) - collects
/// leakage from every cortex around it, so that it cannot be ranked with the others.
struct RankedRegion {
  std::size_t region;
  double rms;
  bool deep;
};
std::vector<RankedRegion> ranked_regions(const ForwardModel& forward,
                                         const LocatedContrast& located,
                                         const SampleRange& samples);
/// The three strongest near the surface; a deep region is named where it is larger still.
std::string strongest_regions(const ForwardModel& forward, const std::vector<RankedRegion>& ranked);

/// How much better a mirrored pair explains the window's mean map, and whether it is too deep to be
/// taken at its word.
std::string pair_note(const ForwardModel& forward, const DipoleVerdict& verdict);
/// What to know about a peak, or "".
std::string peak_note(const ForwardModel& forward, const DipoleVerdict& verdict,
                      const SourceOperator& inverse, Eigen::Index point);

/// Two notes as one, or "".
std::string joined_notes(const std::string& first, const std::string& second);

}  // namespace headwater
