// SPDX-License-Identifier: GPL-3.0-or-later
// The template head against measured figures (templates/README.md: measured on MNI-space volumes).
#include "base_scratch.hpp"

#include <headwater/base/error.hpp>
#include <headwater/base/random.hpp>
#include <headwater/base/units.hpp>
#include <headwater/model/head.hpp>
#include <headwater/model/mni_map.hpp>
#include <headwater/model/source_grid.hpp>
#include <headwater/model/template_brain.hpp>

#include <Eigen/Geometry>
#include <Eigen/LU>
#include <fmt/core.h>
#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <map>
#include <set>

namespace headwater {
namespace {

using Eigen::Vector3d;

constexpr double kScalp = 0.092;

// Source: check values printed with the fitted coefficients, mm, three decimals.
TEST(TemplateHead, HullRadiiArePrintedOnes) {
  const std::vector<std::pair<Vector3d, double>> printed{
      {{0, 0, 1}, 84.007}, {{0, 1, 0}, 89.100},    {{0, -1, 0}, 90.475},   {{1, 0, 0}, 71.496},
      {{1, 1, 1}, 79.359}, {{-1, 2, 1.5}, 82.246}, {{1, -1, -0.5}, 71.222}};
  for (const auto& [direction, radius_mm] : printed) {
    EXPECT_NEAR(hull_radius(direction) / kMillimetre, radius_mm, 0.5e-3) << direction.transpose();
    EXPECT_NEAR(hull_radius(3e-3 * direction) / kMillimetre, radius_mm, 0.5e-3);
  }
}

// The sum written out with the standard library's associated Legendre functions (no Condon-Shortley
// phase), from the coefficients as they were printed.
TEST(TemplateHead, HullIsTheSphericalHarmonicSum) {
  const std::vector<std::vector<double>> c{{259.577},
                                           {39.210, 0.338},
                                           {-17.207, -8.723, 9.112},
                                           {3.361, 1.381, 8.051, 1.191},
                                           {4.153, -3.164, -6.220, 1.836, -0.199},
                                           {-2.106, -1.713, -0.339, -1.094, 0.220, -1.042},
                                           {-1.549, 0.971, 3.386, 1.878, -0.602, 0.140, -0.489}};
  RandomStream random(1, "hull");
  for (int repeat = 0; repeat < 50; ++repeat) {
    const Vector3d u = Vector3d(random.normal_matrix(3, 1)).normalized();
    double radius_mm = 0;
    for (unsigned l = 0; l <= 6; ++l)
      for (unsigned m = 0; m <= l; ++m)
        radius_mm +=
            c[l][m] * (m > 0 ? std::sqrt(2.0) : 1) *
            std::sqrt((2 * l + 1) / (4 * kPi) * std::tgamma(l - m + 1) / std::tgamma(l + m + 1)) *
            std::assoc_legendre(l, m, u.z()) * std::cos(m * std::atan2(u.x(), u.y()));
    EXPECT_NEAR(hull_radius(u) / kMillimetre, radius_mm, 1e-10);
    const Vector3d mirrored(-u.x(), u.y(), u.z());
    EXPECT_NEAR(hull_radius(u), hull_radius(mirrored), 1e-16);
    EXPECT_LE(drawn_brain_radius(u), hull_radius(u));
    EXPECT_GE(drawn_brain_radius(u), hull_radius(u) - 14.5e-3);  // both grooves: 8 and 6 mm
  }
}

// Source: ellipsoid fitted separately to the same hull (rms 2.1 mm): centre (0,-18.3,2.4),
// semi-axes (72.2, 88.7, 80.0) mm MNI; straight up, ahead and right agree within 5 mm.
TEST(TemplateHead, HullAgreesWithASeparatelyFittedEllipsoid) {
  const Eigen::Array3d axes_m = Eigen::Array3d(72.2, 88.7, 80.0) * kMillimetre;
  const Vector3d offset = kHeadCentreMni - Vector3d(0, -18.3, 2.4) * kMillimetre;
  for (const Vector3d& u : {Vector3d(0, 0, 1), Vector3d(0, 1, 0), Vector3d(1, 0, 0)}) {
    const Vector3d a = u.array() / axes_m, b = offset.array() / axes_m;
    const double half = a.dot(b),
                 radius =
                     (-half + std::sqrt(half * half - a.squaredNorm() * (b.squaredNorm() - 1))) /
                     a.squaredNorm();
    EXPECT_NEAR(hull_radius(u), radius, 5e-3) << u.transpose();
  }
}

TEST(TemplateHead, MappingAndItsInverse) {
  RandomStream random(2, "map");
  for (int repeat = 0; repeat < 200; ++repeat) {
    const Vector3d mni = 0.06 * Vector3d(random.normal_matrix(3, 1)) + kHeadCentreMni;
    const Vector3d head = mni_to_head(mni, kScalp);
    EXPECT_LE((head_to_mni(head, kScalp) - mni).norm(), 1e-12 * 0.06);
    // Radial: the direction about the centre stays.
    EXPECT_LE(head.normalized().cross((mni - kHeadCentreMni).normalized()).norm(), 1e-14);
    const Vector3d image = mni_to_head({-mni.x(), mni.y(), mni.z()}, kScalp);
    EXPECT_LE((image - Vector3d(-head.x(), head.y(), head.z())).norm(), 1e-16);
    // Depth: the radii differ by it, and the hull lands at 0.83 of the scalp.
    const Vector3d u = (mni - kHeadCentreMni).normalized();
    EXPECT_NEAR(depth_below_hull(mni), hull_radius(u) - (mni - kHeadCentreMni).norm(), 1e-16);
    EXPECT_NEAR(mni_to_head(kHeadCentreMni + hull_radius(u) * u, kScalp).norm(), 0.83 * kScalp,
                1e-15);
  }
  EXPECT_EQ(mni_to_head(kHeadCentreMni, kScalp), Vector3d::Zero());
  EXPECT_EQ(head_to_mni(Vector3d::Zero(), kScalp), kHeadCentreMni);
}

// Source: mean displacement at the template's own scale (99.2 mm) 5.7 mm, at most 37 mm (basal
// points).
TEST(TemplateHead, MappingMovesPointsAsMuchAsMeasured) {
  const SourceGrid grid = lattice_grid(6e-3, 0.0992);
  const Eigen::VectorXd moved =
      (grid.head_m - (grid.mni_m.colwise() - kHeadCentreMni)).colwise().norm();
  EXPECT_NEAR(moved.mean() / kMillimetre, 5.7, 0.5);
  EXPECT_NEAR(moved.maxCoeff() / kMillimetre, 37, 3);
  Eigen::Index farthest = 0;
  moved.maxCoeff(&farthest);
  EXPECT_LT(grid.mni_m(2, farthest), -20e-3);
}

// Source: counted where the rule was fitted; lattice through the MNI origin.
TEST(TemplateHead, GridCounts) {
  const std::map<int, Eigen::Index> counted{{10, 1102}, {8, 2126}, {7, 3170}, {6, 5066}, {5, 8673}};
  for (const auto& [spacing_mm, points] : counted) {
    const SourceGrid grid = lattice_grid(spacing_mm * kMillimetre, kScalp);
    EXPECT_EQ(grid.size(), points) << spacing_mm << " mm";
    EXPECT_EQ(grid.mirror.size(), static_cast<std::size_t>(points));
  }
}

// Rounding of a spacing given in metres must not move points across the borders of the rule.
TEST(TemplateHead, GridDoesNotDependOnRoundingOfTheSpacing) {
  for (const double h : {4.0, 4.8, 6.0, 7.5, 8.0, 9.0, 12.0}) {
    const double exact = h / 1000, product = h * kMillimetre;
    const Eigen::Index points = lattice_grid(exact, kScalp).size();
    for (const double other : {product, std::nextafter(exact, 0.0), std::nextafter(exact, 1.0)})
      EXPECT_EQ(lattice_grid(other, kScalp).size(), points) << h;
  }
}

TEST(TemplateHead, GridIsMirroredExactly) {
  const SourceGrid grid = lattice_grid(7e-3, kScalp);
  Eigen::Index midline = 0;
  for (Eigen::Index p = 0; p < grid.size(); ++p) {
    const Eigen::Index q = grid.mirror[static_cast<std::size_t>(p)];
    ASSERT_GE(q, 0);
    EXPECT_EQ(grid.mirror[static_cast<std::size_t>(q)], p);
    for (const auto* points : {&grid.mni_m, &grid.head_m}) {
      EXPECT_EQ((*points)(0, q), -(*points)(0, p));
      EXPECT_EQ((*points)(1, q), (*points)(1, p));
      EXPECT_EQ((*points)(2, q), (*points)(2, p));
    }
    EXPECT_EQ(grid.mni_m.col(p), Vector3d(grid.lattice.col(p).cast<double>() * 7e-3));
    midline += q == p;
    // In the head: below the hull's image, so inside the brain shell of the default head.
    EXPECT_LT(grid.head_m.col(p).norm(), 0.83 * kScalp);
    EXPECT_GT(grid.depth_m[p], 1e-3);
  }
  EXPECT_GT(midline, 50);
  EXPECT_LT(midline, 300);
  for (Eigen::Index p = 1; p < grid.size(); ++p) {  // ordered by z, then y, then x
    const auto &a = grid.lattice.col(p - 1), &b = grid.lattice.col(p);
    EXPECT_TRUE(std::make_tuple(a.z(), a.y(), a.x()) < std::make_tuple(b.z(), b.y(), b.x()));
  }
}

// Source: cortex at a median 0.86 and at most 0.985 of the hull, measured on the labelled volume.
TEST(TemplateHead, GridLiesWhereCortexIs) {
  const SourceGrid grid = lattice_grid(6e-3, kScalp);
  std::vector<double> share;
  for (Eigen::Index p = 0; p < grid.size(); ++p)
    share.push_back(grid.head_m.col(p).norm() / (0.83 * kScalp));
  std::sort(share.begin(), share.end());
  EXPECT_NEAR(share[share.size() / 2], 0.86, 0.03);
  EXPECT_NEAR(share.back(), 0.985, 0.01);
}

TEST(TemplateHead, NeighboursAreMutual) {
  for (const double spacing : {7e-3, 10e-3}) {
    const SourceGrid grid = lattice_grid(spacing, kScalp);
    const auto neighbours = grid_neighbours(grid);
    ASSERT_EQ(neighbours.size(), static_cast<std::size_t>(grid.size()));
    std::size_t largest = 0;
    for (Eigen::Index p = 0; p < grid.size(); ++p) {
      const auto& list = neighbours[static_cast<std::size_t>(p)];
      largest = std::max(largest, list.size());
      EXPECT_TRUE(std::is_sorted(list.begin(), list.end()));
      EXPECT_EQ(std::adjacent_find(list.begin(), list.end()), list.end());
      for (const Eigen::Index q : list) {
        EXPECT_NE(q, p);
        EXPECT_LE((grid.mni_m.col(p) - grid.mni_m.col(q)).norm(), std::sqrt(3.0) * spacing + 1e-12);
        const auto& back = neighbours[static_cast<std::size_t>(q)];
        EXPECT_TRUE(std::binary_search(back.begin(), back.end(), p));
      }
      // Brute force for some: all points within one step along every axis.
      if (p % 97 == 0) {
        const Eigen::Index expected = ((grid.lattice.colwise() - grid.lattice.col(p))
                                           .cwiseAbs()
                                           .colwise()
                                           .maxCoeff()
                                           .array() <= 1)
                                          .count() -
                                      1;
        EXPECT_EQ(static_cast<Eigen::Index>(list.size()), expected);
      }
    }
    EXPECT_LE(largest, 26u);
    EXPECT_GE(largest, 17u);
  }
}

TEST(TemplateHead, LatticeVolumeHoldsEveryPoint) {
  const SourceGrid grid = lattice_grid(8e-3, kScalp);
  const Volume volume = lattice_volume(grid);
  const auto voxels = lattice_voxels(grid);
  EXPECT_EQ(std::set<Eigen::Index>(voxels.begin(), voxels.end()).size(), voxels.size());
  for (Eigen::Index p = 0; p < grid.size(); ++p) {
    const Eigen::Index v = voxels[static_cast<std::size_t>(p)];
    const Eigen::Index nx = volume.size[0], ny = volume.size[1];
    const Eigen::Vector4d index(static_cast<double>(v % nx), static_cast<double>(v / nx % ny),
                                static_cast<double>(v / (nx * ny)), 1);
    EXPECT_LE(((volume.affine_mm * index).head<3>() - grid.mni_m.col(p) / kMillimetre).norm(),
              1e-9);
  }
}

TEST(TemplateHead, RefusesSpacingsOutOfRange) {
  for (const double spacing : {3.9e-3, 12.1e-3, 7.0, 0.0, -7e-3, std::nan("")})
    EXPECT_THROW(lattice_grid(spacing, kScalp), ExperimentError) << spacing;
}

TEST(TemplateHead, UsersPointsInEitherFrame) {
  Eigen::Matrix3Xd mni(3, 6);
  mni << -52, 52.4, 0, 30, 40, 10,  //
      -22, -22, 10, -60, 5, 0,      //
      8, 8, 60, 40, 35, 50;
  mni *= kMillimetre;
  const Labels names{"a", "b", "c", "d", "e", "f"};
  const SourceGrid grid = point_grid(names, mni, PointSpace::mni, kScalp);
  EXPECT_EQ(grid.names, names);
  EXPECT_EQ(grid.mni_m, mni);
  EXPECT_FALSE(grid.is_lattice());
  EXPECT_EQ(grid.mirror, (std::vector<Eigen::Index>{1, 0, 2, -1, -1, -1}));
  for (Eigen::Index p = 0; p < 6; ++p) {
    EXPECT_LE((grid.head_m.col(p) - mni_to_head(mni.col(p), kScalp)).norm(), 1e-16);
    EXPECT_NEAR(grid.depth_m[p], depth_below_hull(mni.col(p)), 1e-16);
  }
  const SourceGrid back = point_grid(names, grid.head_m, PointSpace::head, kScalp);
  EXPECT_EQ(back.head_m, grid.head_m);
  EXPECT_LE((back.mni_m - mni).cwiseAbs().maxCoeff(), 1e-15);
  EXPECT_EQ(back.mirror, grid.mirror);
  EXPECT_NEAR(back.spacing_m, grid.spacing_m, 1e-15);
}

// The frame in which the points are given must not change who is whose neighbour: a lattice of
// points has the neighbours of a lattice.
TEST(TemplateHead, UsersLatticeHasLatticeNeighboursInEitherFrame) {
  const SourceGrid lattice = lattice_grid(12e-3, kScalp);
  Labels names;
  for (Eigen::Index p = 0; p < lattice.size(); ++p) names.push_back(fmt::format("p{}", p));
  const auto expected = grid_neighbours(lattice);
  EXPECT_EQ(grid_neighbours(point_grid(names, lattice.mni_m, PointSpace::mni, kScalp)), expected);
  EXPECT_EQ(grid_neighbours(point_grid(names, lattice.head_m, PointSpace::head, kScalp)), expected);
}

TEST(TemplateHead, RefusesUsersPointsThatAreNone) {
  Eigen::Matrix3Xd points(3, 2);
  points << 0.01, 0.01, 0, 0, 0.02, 0.02;
  const std::string message = message_of<InputError>([&] {
    point_grid({"one", "two"}, points, PointSpace::mni, kScalp);
  });
  EXPECT_NE(message.find("one"), std::string::npos) << message;
  EXPECT_NE(message.find("two"), std::string::npos) << message;
  points(1, 1) = std::nan("");
  EXPECT_NE(message_of<InputError>([&] {
              point_grid({"one", "two"}, points, PointSpace::mni, kScalp);
            }).find("two"),
            std::string::npos);
}

}  // namespace
}  // namespace headwater
