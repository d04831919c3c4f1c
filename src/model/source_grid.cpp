// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/error.hpp>
#include <headwater/base/units.hpp>
#include <headwater/model/mni_map.hpp>
#include <headwater/model/source_grid.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <limits>
#include <map>
#include <stdexcept>

namespace headwater {
namespace {

constexpr double kMirrorTolerance = 1e-3;  // m, for the user's points

double square(double v) {
  return v * v;
}

/// The rule of the header; coordinates and depth in mm.
bool is_cortex(double x, double y, double z, double depth) {
  const double side = std::abs(x);
  if (!(depth > 1) || !(z > -48)) return false;
  const bool above_tentorium = y > -25 || z > -27.3 - 0.814 * side - 1.011 * y +
                                                  5.33 * square(x / 30) - 30.7 * square(y / 60);
  if (!above_tentorium) return false;
  if (depth <= 18) return true;
  const bool core = square((side - 21) / 25) + square((y + 15) / 68) + square((z + 22) / 77) < 1 ||
                    square(x / 23) + square((y + 36) / 10) + square((z + 19) / 27) < 1;
  if (side <= 12 && !core) return true;
  if (depth <= 34 && side >= 30 && y > -42 && y < 28 && z > -20 && z < 24) return true;
  return side >= 12 && side <= 36 && y > -85 && y < 0 && z > -34 && z < -6;
}

using LatticeKey = std::array<int, 3>;

std::map<LatticeKey, Eigen::Index> lattice_index(const SourceGrid& grid) {
  std::map<LatticeKey, Eigen::Index> index;
  for (Eigen::Index p = 0; p < grid.size(); ++p)
    index[{grid.lattice(0, p), grid.lattice(1, p), grid.lattice(2, p)}] = p;
  return index;
}

void fill_depth(SourceGrid& grid) {
  grid.depth_m.resize(grid.size());
  for (Eigen::Index p = 0; p < grid.size(); ++p)
    grid.depth_m[p] = depth_below_hull(grid.mni_m.col(p));
}

/// Point of the grid nearest to `place` (not `self`), with its distance.
std::pair<Eigen::Index, double> nearest_point(const Eigen::Matrix3Xd& points,
                                              const Eigen::Vector3d& place, Eigen::Index self) {
  std::pair<Eigen::Index, double> best{-1, std::numeric_limits<double>::infinity()};
  for (Eigen::Index p = 0; p < points.cols(); ++p) {
    const double distance = (points.col(p) - place).norm();
    if (p != self && distance < best.second) best = {p, distance};
  }
  return best;
}

}  // namespace

SourceGrid lattice_grid(double spacing_m, double scalp_radius_m) {
  // Rounded to 1 pm, so that a point on a border of the rule does not move over it by rounding.
  const double h = std::round(spacing_m * 1e12) / 1e9;
  if (!(h >= 4 - 1e-9 && h <= 12 + 1e-9))
    throw ExperimentError(fmt::format("The grid's spacing is {:g} mm: expected 4 to 12 mm.", h));
  SourceGrid grid;
  grid.spacing_m = spacing_m;
  std::vector<LatticeKey> kept;
  const int reach =
      static_cast<int>(std::ceil(130 / h));  // the hull ends within 130 mm of the origin
  for (int k = -reach; k <= reach; ++k)
    for (int j = -reach; j <= reach; ++j)
      for (int i = -reach; i <= reach; ++i) {
        const Eigen::Vector3d mm(i * h, j * h, k * h);
        // |x| decides, so that both sides keep the same points to the last bit.
        const Eigen::Vector3d right(std::abs(mm.x()), mm.y(), mm.z());
        if (is_cortex(mm.x(), mm.y(), mm.z(), depth_below_hull(right * kMillimetre) / kMillimetre))
          kept.push_back({i, j, k});
      }
  const auto count = static_cast<Eigen::Index>(kept.size());
  grid.lattice.resize(3, count);
  grid.mni_m.resize(3, count);
  grid.head_m.resize(3, count);
  for (Eigen::Index p = 0; p < count; ++p) {
    const auto& key = kept[static_cast<std::size_t>(p)];
    grid.lattice.col(p) << key[0], key[1], key[2];
    grid.mni_m.col(p) = grid.lattice.col(p).cast<double>() * spacing_m;
    Eigen::Vector3d right = grid.mni_m.col(p);
    right.x() = std::abs(right.x());
    grid.head_m.col(p) = mni_to_head(right, scalp_radius_m);
    if (key[0] < 0) grid.head_m(0, p) = -grid.head_m(0, p);
  }
  const auto index = lattice_index(grid);
  grid.mirror.resize(kept.size());
  for (std::size_t p = 0; p < kept.size(); ++p)
    grid.mirror[p] = index.at({-kept[p][0], kept[p][1], kept[p][2]});
  fill_depth(grid);
  return grid;
}

SourceGrid point_grid(const Labels& names, const Eigen::Matrix3Xd& points_m, PointSpace space,
                      double scalp_radius_m) {
  if (static_cast<Eigen::Index>(names.size()) != points_m.cols())
    throw InputError(fmt::format("{} names for {} source points: expected one each.", names.size(),
                                 points_m.cols()));
  SourceGrid grid;
  grid.names = names;
  grid.mni_m = grid.head_m = points_m;
  std::vector<double> nearest;
  for (Eigen::Index p = 0; p < points_m.cols(); ++p) {
    const auto& name = names[static_cast<std::size_t>(p)];
    if (!points_m.col(p).allFinite())
      throw InputError(
          fmt::format("Source point '{}' has a coordinate that is not a number.", name));
    if (space == PointSpace::mni)
      grid.head_m.col(p) = mni_to_head(points_m.col(p), scalp_radius_m);
    else
      grid.mni_m.col(p) = head_to_mni(points_m.col(p), scalp_radius_m);
  }
  // Distances in MNI space whatever the points' own frame: the mapping between them stretches.
  for (Eigen::Index p = 0; p < points_m.cols(); ++p) {
    const auto [other, distance] = nearest_point(grid.mni_m, grid.mni_m.col(p), p);
    if (other >= 0 && distance < 1e-6)
      throw InputError(
          fmt::format("Source points '{}' and '{}' lie on the same place: leave one out.",
                      names[static_cast<std::size_t>(p)], names[static_cast<std::size_t>(other)]));
    if (other >= 0) nearest.push_back(distance);
  }
  if (!nearest.empty()) {
    const auto middle = nearest.begin() + static_cast<std::ptrdiff_t>(nearest.size() / 2);
    std::nth_element(nearest.begin(), middle, nearest.end());
    grid.spacing_m = *middle;
  }
  grid.mirror.assign(names.size(), -1);
  for (Eigen::Index p = 0; p < grid.size(); ++p) {
    Eigen::Vector3d image = grid.mni_m.col(p);
    image.x() = -image.x();
    const auto [other, distance] = nearest_point(grid.mni_m, image, -1);
    if (distance <= kMirrorTolerance) grid.mirror[static_cast<std::size_t>(p)] = other;
  }
  // Where two points compete for one image the map would not be an involution: neither has a
  // mirror.
  const auto first = grid.mirror;
  for (std::size_t p = 0; p < first.size(); ++p)
    if (first[p] >= 0 && first[static_cast<std::size_t>(first[p])] != static_cast<Eigen::Index>(p))
      grid.mirror[p] = -1;
  fill_depth(grid);
  return grid;
}

std::vector<std::vector<Eigen::Index>> grid_neighbours(const SourceGrid& grid) {
  std::vector<std::vector<Eigen::Index>> neighbours(static_cast<std::size_t>(grid.size()));
  if (!grid.is_lattice()) {
    for (Eigen::Index p = 0; p < grid.size(); ++p)
      for (Eigen::Index q = 0; q < grid.size(); ++q)
        if (p != q && (grid.mni_m.col(p) - grid.mni_m.col(q)).norm() <= 1.8 * grid.spacing_m)
          neighbours[static_cast<std::size_t>(p)].push_back(q);
    return neighbours;
  }
  const auto index = lattice_index(grid);
  for (const auto& [key, p] : index) {
    auto& list = neighbours[static_cast<std::size_t>(p)];
    for (int k = -1; k <= 1; ++k)
      for (int j = -1; j <= 1; ++j)
        for (int i = -1; i <= 1; ++i) {
          const auto found = index.find({key[0] + i, key[1] + j, key[2] + k});
          if (found != index.end() && found->second != p) list.push_back(found->second);
        }
    std::sort(list.begin(), list.end());
  }
  return neighbours;
}

Volume lattice_volume(const SourceGrid& grid) {
  if (!grid.is_lattice()) throw std::logic_error("only a lattice makes a volume");
  const Eigen::Vector3i low = grid.lattice.rowwise().minCoeff();
  const Eigen::Vector3i size = grid.lattice.rowwise().maxCoeff() - low + Eigen::Vector3i::Ones();
  Volume volume;
  volume.size = {size.x(), size.y(), size.z()};
  const double h = grid.spacing_m / kMillimetre;
  volume.affine_mm.diagonal().head<3>().setConstant(h);
  volume.affine_mm.topRightCorner<3, 1>() = low.cast<double>() * h;
  volume.values = Eigen::MatrixXd::Zero(Eigen::Index{size.x()} * size.y() * size.z(), 1);
  return volume;
}

std::vector<Eigen::Index> lattice_voxels(const SourceGrid& grid) {
  const Volume volume = lattice_volume(grid);
  const Eigen::Vector3i low = grid.lattice.rowwise().minCoeff();
  std::vector<Eigen::Index> voxels(static_cast<std::size_t>(grid.size()));
  for (Eigen::Index p = 0; p < grid.size(); ++p) {
    const Eigen::Vector3i at = grid.lattice.col(p) - low;
    voxels[static_cast<std::size_t>(p)] =
        at.x() + Eigen::Index{volume.size[0]} * (at.y() + Eigen::Index{volume.size[1]} * at.z());
  }
  return voxels;
}

}  // namespace headwater
