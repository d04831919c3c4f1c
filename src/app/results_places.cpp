// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/results_places.hpp"

#include <headwater/base/units.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <cmath>

namespace headwater {
namespace {

const std::vector<ColumnInfo> kPlaceColumns = {
    {"x_mm", "MNI coordinate, to the right", "mm"},
    {"y_mm", "MNI coordinate, forwards", "mm"},
    {"z_mm", "MNI coordinate, upwards", "mm"},
    {"side", "left, right or midline", ""},
    {"gyrus", "Gyrus of the nearest landmark (or the atlas label)", ""},
    {"lobe", "Lobe", ""},
    {"brodmann", "Customary Brodmann areas of the gyrus (textbook knowledge, not measured)", ""},
    {"nearby", "Gyri with a landmark within 15 mm, nearest first: the labels are that uncertain",
     ""},
    {"depth_mm", "Depth below the hull of the template brain, on the ray from the centre", "mm"}};

const char* const kMergedNote =
    "likely false: two symmetric generators merged into one maximum; see the mirrored pair";

const char* const kSuppressedNote =
    "LCMV suppresses correlated sources of both sides: compare lcmv.mirror_paired = true";

bool is_deep(const ForwardModel& forward, const Region& region) {
  std::vector<double> depths;
  for (const Eigen::Index p : region.points) depths.push_back(forward.grid.depth_m[p]);
  const auto middle = depths.begin() + static_cast<std::ptrdiff_t>(depths.size() / 2);
  std::nth_element(depths.begin(), middle, depths.end());
  return *middle > 25 * kMillimetre;
}

}  // namespace

std::string mm(double metres) {
  return format_fixed(metres / kMillimetre, 1);
}
std::string ms(double seconds) {
  return format_fixed(seconds / kMillisecond, 1);
}
std::string percent(double share) {
  return format_fixed(100 * share, 1);
}

void append(Row& row, std::initializer_list<std::string> cells) {
  row.insert(row.end(), cells.begin(), cells.end());
}

Place place_of(const ForwardModel& forward, Eigen::Index point) {
  const auto p = static_cast<std::size_t>(point);
  const int gyrus = forward.labels.gyrus[p];
  const std::string side = side_name(forward.labels.side[p]);
  if (gyrus < 0) return {side, "n/a", "n/a", "n/a"};
  const Gyrus& found = forward.labels.gyri[static_cast<std::size_t>(gyrus)];
  return {side, found.abbreviation, found.lobe, found.brodmann};
}

void append_place(Row& row, const ForwardModel& forward, Eigen::Index point) {
  const auto at = forward.grid.mni_m.col(point);
  const Place place = place_of(forward, point);
  append(row,
         {mm(at.x()), mm(at.y()), mm(at.z()), place.side, place.gyrus, place.lobe, place.brodmann,
          join_labels(nearby_gyri(at, 15 * kMillimetre)), mm(forward.grid.depth_m[point])});
  if (row[row.size() - 2].empty()) row[row.size() - 2] = "n/a";
}

std::vector<ColumnInfo> with_place_columns(std::vector<ColumnInfo> before,
                                           const std::vector<ColumnInfo>& after) {
  before.insert(before.end(), kPlaceColumns.begin(), kPlaceColumns.end());
  before.insert(before.end(), after.begin(), after.end());
  return before;
}

std::string pair_note(const ForwardModel& forward, const DipoleVerdict& verdict) {
  std::string note = fmt::format(
      "one mirrored pair leaves {} % of the window's mean map unexplained, the best single point "
      "{} %",
      percent(verdict.pair.unexplained), percent(verdict.one.unexplained));
  note += fmt::format("; moments {:.1f} nA m left, {:.1f} right",
                      verdict.pair.partner_moment_Am.norm() / kNanoampereMetre,
                      verdict.pair.moment_Am.norm() / kNanoampereMetre);
  if (!may_be_merged(forward.grid, verdict.pair.point)) return note;
  return note + "; it lies deep and may itself stand for extended or further sources";
}

std::vector<RankedRegion> ranked_regions(const ForwardModel& forward,
                                         const LocatedContrast& located,
                                         const SampleRange& samples) {
  std::vector<RankedRegion> ranked;
  for (Eigen::Index r = 0; r < located.courses.rms.rows(); ++r) {
    const auto region = static_cast<std::size_t>(r);
    ranked.push_back(
        {region,
         std::sqrt(located.courses.rms.row(r).segment(samples.first, samples.count).squaredNorm() /
                   static_cast<double>(samples.count)),
         is_deep(forward, forward.regions[region])});
  }
  std::stable_sort(ranked.begin(), ranked.end(), [](const RankedRegion& a, const RankedRegion& b) {
    return a.deep != b.deep ? b.deep : a.rms > b.rms;
  });
  return ranked;
}

std::string strongest_regions(const ForwardModel& forward,
                              const std::vector<RankedRegion>& ranked) {
  std::string text;
  const RankedRegion* deep = nullptr;
  for (std::size_t k = 0; k < ranked.size(); ++k) {
    const auto& name = forward.regions[ranked[k].region].name;
    if (!ranked[k].deep && k < 3) text += (k > 0 ? ", " : "") + name;
    if (ranked[k].deep && !deep) deep = &ranked[k];
  }
  if (deep && (ranked[0].deep || deep->rms > ranked[0].rms))
    text += fmt::format("{}{} (deep)",
                        text.empty() ? "" : "; larger: ", forward.regions[deep->region].name);
  return text;
}

std::string joined_notes(const std::string& first, const std::string& second) {
  return first + (first.empty() || second.empty() ? "" : "; ") + second;
}

std::string peak_note(const ForwardModel& forward, const DipoleVerdict& verdict,
                      const SourceOperator& inverse, Eigen::Index point) {
  if (!verdict.pair_preferred) return "";
  if (may_be_merged(forward.grid, point)) return kMergedNote;
  return inverse.pair_blind ? kSuppressedNote : "";
}

}  // namespace headwater
