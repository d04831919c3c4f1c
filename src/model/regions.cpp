// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/embedded_file.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/nifti.hpp>
#include <headwater/base/table.hpp>
#include <headwater/base/units.hpp>
#include <headwater/model/regions.hpp>

#include <Eigen/Geometry>
#include <Eigen/LU>
#include <fmt/core.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <map>
#include <set>

namespace headwater {
namespace {

struct Landmarks {
  std::vector<Gyrus> gyri;
  std::vector<int> gyrus;        // of each landmark
  Eigen::Matrix3Xd right_mni_m;  // right hemisphere
};

Landmarks read_landmarks() {
  const Table table = parse_table(embedded_file("gyri.tsv"), "templates/gyri.tsv");
  const auto abbreviation = table.column("abbreviation"), name = table.column("name"),
             lobe = table.column("lobe"), brodmann = table.column("brodmann"),
             x = table.column("x_mm");
  Landmarks marks;
  marks.right_mni_m.resize(3, static_cast<Eigen::Index>(table.rows.size()));
  std::map<std::string, int> seen;
  for (std::size_t row = 0; row < table.rows.size(); ++row) {
    const auto& cells = table.rows[row];
    const auto [entry, added] =
        seen.try_emplace(cells[abbreviation], static_cast<int>(marks.gyri.size()));
    if (added)
      marks.gyri.push_back({cells[abbreviation], cells[name], cells[lobe], cells[brodmann]});
    marks.gyrus.push_back(entry->second);
    for (std::size_t axis = 0; axis < 3; ++axis)
      marks.right_mni_m(static_cast<Eigen::Index>(axis), static_cast<Eigen::Index>(row)) =
          table.number(row, x + axis) * kMillimetre;
  }
  return marks;
}

const Landmarks& landmarks() {
  static const Landmarks marks = read_landmarks();
  return marks;
}

int nearest_gyrus(const Eigen::Vector3d& mni_m) {
  const Eigen::Vector3d right(std::abs(mni_m.x()), mni_m.y(), mni_m.z());
  Eigen::Index nearest = 0;
  (landmarks().right_mni_m.colwise() - right).colwise().squaredNorm().minCoeff(&nearest);
  return landmarks().gyrus[static_cast<std::size_t>(nearest)];
}

std::vector<Side> sides_of(const SourceGrid& grid) {
  std::vector<Side> sides;
  for (Eigen::Index p = 0; p < grid.size(); ++p) sides.push_back(side_of(grid.mni_m(0, p)));
  return sides;
}

/// Column's cell or "n/a" where the table lacks the column.
std::string cell_or_na(const Table& table, std::size_t row, const char* column) {
  const auto at = table.find_column(column);
  return at && !table.rows[row][*at].empty() ? table.rows[row][*at] : "n/a";
}

std::map<int, Gyrus> read_atlas_table(const std::filesystem::path& path) {
  const Table table = read_table(path, "atlas table");
  const auto index = table.column("index"), name = table.column("name");
  std::map<int, Gyrus> gyri;
  for (std::size_t row = 0; row < table.rows.size(); ++row) {
    const std::string& full = table.rows[row][name];
    Gyrus gyrus{cell_or_na(table, row, "abbreviation"), full,
                fold_case(cell_or_na(table, row, "lobe")), cell_or_na(table, row, "brodmann")};
    if (gyrus.abbreviation == "n/a") gyrus.abbreviation = full;
    gyri.emplace(static_cast<int>(table.number(row, index)), gyrus);
  }
  return gyri;
}

/// Voxel nearest to an MNI place, or -1 outside the volume.
Eigen::Index voxel_at(const Volume& volume, const Eigen::Matrix4d& mm_to_voxel,
                      const Eigen::Vector3d& mni_mm) {
  const Eigen::Vector4d at = mm_to_voxel * mni_mm.homogeneous();
  std::array<Eigen::Index, 3> voxel{};
  for (std::size_t axis = 0; axis < 3; ++axis) {
    voxel[axis] = static_cast<Eigen::Index>(std::lround(at[static_cast<Eigen::Index>(axis)]));
    if (voxel[axis] < 0 || voxel[axis] >= volume.size[axis]) return -1;
  }
  return voxel[0] + volume.size[0] * (voxel[1] + volume.size[1] * voxel[2]);
}

Labels lobes_of(const PointLabels& labels) {
  Labels lobes;
  for (const auto& gyrus : labels.gyri)
    if (gyrus.lobe != "n/a" && !find_label(lobes, gyrus.lobe)) lobes.push_back(gyrus.lobe);
  return lobes;
}

template <typename Belongs>
std::vector<Eigen::Index> points_where(const PointLabels& labels, const Belongs& belongs) {
  std::vector<Eigen::Index> points;
  for (std::size_t p = 0; p < labels.gyrus.size(); ++p)
    if (labels.gyrus[p] >= 0 &&
        belongs(labels.gyri[static_cast<std::size_t>(labels.gyrus[p])], labels.side[p]))
      points.push_back(static_cast<Eigen::Index>(p));
  return points;
}

}  // namespace

std::string side_name(Side side) {
  return side == Side::left ? "left" : side == Side::right ? "right" : "midline";
}

Side side_of(double x_m) {
  return x_m < 0 ? Side::left : x_m > 0 ? Side::right : Side::midline;
}

Gyrus template_gyrus(const Eigen::Vector3d& mni_m) {
  return landmarks().gyri[static_cast<std::size_t>(nearest_gyrus(mni_m))];
}

Labels nearby_gyri(const Eigen::Vector3d& mni_m, double distance_m) {
  const Eigen::Vector3d right(std::abs(mni_m.x()), mni_m.y(), mni_m.z());
  const auto& marks = landmarks();
  std::vector<std::pair<double, int>> order;
  for (std::size_t k = 0; k < marks.gyrus.size(); ++k) {
    const double distance = (marks.right_mni_m.col(static_cast<Eigen::Index>(k)) - right).norm();
    if (distance <= distance_m) order.emplace_back(distance, marks.gyrus[k]);
  }
  std::sort(order.begin(), order.end());
  Labels names;
  for (const auto& [distance, gyrus] : order) {
    const auto& name = marks.gyri[static_cast<std::size_t>(gyrus)].abbreviation;
    if (!find_label(names, name)) names.push_back(name);
  }
  return names;
}

PointLabels template_labels(const SourceGrid& grid) {
  PointLabels labels;
  labels.gyri = landmarks().gyri;
  labels.side = sides_of(grid);
  for (Eigen::Index p = 0; p < grid.size(); ++p)
    labels.gyrus.push_back(nearest_gyrus(grid.mni_m.col(p)));
  labels.source =
      "Gyri by the nearest landmark of the template (agreement with measured label volumes: "
      "gyrus 0.76, lobe 0.94); Brodmann areas are customary.";
  return labels;
}

PointLabels atlas_labels(const SourceGrid& grid, const std::filesystem::path& volume_path,
                         const std::filesystem::path& table_path) {
  const Volume volume = read_nifti(volume_path);
  const auto gyri = read_atlas_table(table_path);
  const Eigen::Matrix4d mm_to_voxel = volume.affine_mm.inverse();
  PointLabels labels;
  labels.side = sides_of(grid);
  std::map<int, int> position;  // label -> index in labels.gyri
  for (const auto& [label, gyrus] : gyri) {
    position[label] = static_cast<int>(labels.gyri.size());
    labels.gyri.push_back(gyrus);
  }
  std::set<int> missing;
  bool any = false;
  for (Eigen::Index p = 0; p < grid.size(); ++p) {
    const Eigen::Index voxel = voxel_at(volume, mm_to_voxel, grid.mni_m.col(p) / kMillimetre);
    const int label = voxel >= 0 ? static_cast<int>(std::lround(volume.values(voxel, 0))) : 0;
    const auto found = position.find(label);
    if (label != 0 && found == position.end()) missing.insert(label);
    labels.gyrus.push_back(label != 0 && found != position.end() ? found->second : -1);
    any = any || labels.gyrus.back() >= 0;
  }
  if (!missing.empty()) {
    Labels text;
    for (int label : missing) text.push_back(std::to_string(label));
    throw InputError(fmt::format("{}: label {} of {} has no row: add it (columns index, name).",
                                 table_path.string(), join_labels(text), volume_path.string()));
  }
  if (!any)
    throw InputError(
        fmt::format("{}: no source point lies inside a label: is the volume in MNI space?",
                    volume_path.string()));
  labels.source =
      fmt::format("Regions by the nearest voxel of {}.", volume_path.filename().string());
  return labels;
}

std::vector<Region> lobe_regions(const PointLabels& labels) {
  std::vector<Region> regions;
  for (const auto& lobe : lobes_of(labels))
    for (Side side : {Side::left, Side::right}) {
      Region region{lobe + " " + side_name(side), {}, lobe, side};
      region.points = points_where(
          labels, [&](const Gyrus& gyrus, Side at) { return gyrus.lobe == lobe && at == side; });
      if (!region.points.empty()) regions.push_back(std::move(region));
    }
  return regions;
}

std::vector<Region> requested_regions(const PointLabels& labels,
                                      const std::vector<RegionRequest>& requests) {
  Labels known;
  for (const auto& gyrus : labels.gyri) known.insert(known.end(), {gyrus.abbreviation, gyrus.name});
  const Labels lobes = lobes_of(labels);
  const Labels sides{side_name(Side::left), side_name(Side::right), side_name(Side::midline)};
  std::string problems;
  std::vector<Region> regions;
  for (const auto& request : requests) {
    const std::size_t before = problems.size();
    for (const auto& gyrus : request.gyri)
      if (!find_label_any_case(known, gyrus))
        problems += fmt::format("Region '{}': no gyrus '{}'.{}\n", request.name, gyrus,
                                did_you_mean(gyrus, known));
    if (!request.lobe.empty() && !find_label_any_case(lobes, request.lobe))
      problems += fmt::format("Region '{}': no lobe '{}'; there are {}.\n", request.name,
                              request.lobe, join_labels(lobes));
    if (!request.side.empty() && !find_label(sides, request.side))
      problems += fmt::format("Region '{}': no side '{}'.{}\n", request.name, request.side,
                              did_you_mean(request.side, sides));
    const bool understood = problems.size() == before;
    Region region{request.name, {}, "", Side::midline};
    if (request.side == "left") region.side = Side::left;
    if (request.side == "right") region.side = Side::right;
    if (request.gyri.empty()) region.lobe = fold_case(request.lobe);
    region.points = points_where(labels, [&](const Gyrus& gyrus, Side at) {
      const bool inside =
          find_label_any_case(request.gyri, gyrus.abbreviation) ||
          find_label_any_case(request.gyri, gyrus.name) ||
          (!request.lobe.empty() && fold_case(gyrus.lobe) == fold_case(request.lobe));
      return inside && (request.side.empty() || side_name(at) == request.side);
    });
    if (region.points.empty() && understood)
      problems += fmt::format("Region '{}' holds no source point.\n", request.name);
    regions.push_back(std::move(region));
  }
  if (!problems.empty()) {
    problems.pop_back();
    throw ExperimentError(problems);
  }
  return regions;
}

}  // namespace headwater
