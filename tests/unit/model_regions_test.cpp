// SPDX-License-Identifier: GPL-3.0-or-later
#include "base_scratch.hpp"

#include <headwater/base/error.hpp>
#include <headwater/base/nifti.hpp>
#include <headwater/base/units.hpp>
#include <headwater/model/regions.hpp>
#include <headwater/model/source_grid.hpp>

#include <gtest/gtest.h>

#include <algorithm>
#include <filesystem>
#include <fstream>
#include <set>
#include <string>
#include <vector>

namespace headwater {
namespace {

using Eigen::Vector3d;

constexpr double kScalp = 0.092;

TEST(Regions, LobesComeInMirroredPairs) {
  const SourceGrid grid = lattice_grid(10e-3, kScalp);
  const PointLabels labels = template_labels(grid);
  for (Eigen::Index p = 0; p < grid.size(); ++p) {
    const auto i = static_cast<std::size_t>(p), j = static_cast<std::size_t>(grid.mirror[i]);
    EXPECT_EQ(labels.gyrus[i], labels.gyrus[j]);
    EXPECT_EQ(labels.side[i] == Side::midline, i == j);
    EXPECT_EQ(labels.side[i] == Side::left, labels.side[j] == Side::right);
  }
  const auto regions = lobe_regions(labels);
  std::set<Eigen::Index> seen;
  for (const auto& region : regions) {
    EXPECT_NE(region.side, Side::midline);
    for (const Eigen::Index p : region.points) EXPECT_TRUE(seen.insert(p).second);
  }
  // Every point off the midline belongs to one lobe and side.
  const auto off_midline = std::count_if(labels.side.begin(), labels.side.end(),
                                         [](Side side) { return side != Side::midline; });
  EXPECT_EQ(static_cast<std::ptrdiff_t>(seen.size()), off_midline);
  for (const char* lobe : {"frontal", "parietal", "temporal", "occipital"})
    EXPECT_EQ(std::count_if(regions.begin(), regions.end(),
                            [&](const Region& region) { return region.lobe == lobe; }),
              2)
        << lobe;
}

// Textbook places (MNI mm): Heschl's gyri, frontal pole, occipital pole, supramarginal gyrus.
TEST(Regions, TextbookPlaces) {
  const auto at = [](double x, double y, double z) {
    return template_gyrus(Vector3d(x, y, z) * kMillimetre);
  };
  EXPECT_EQ(at(48, -18, 8).lobe, "temporal");
  EXPECT_EQ(at(-48, -18, 8).lobe, "temporal");
  EXPECT_EQ(at(20, 62, 8).lobe, "frontal");
  EXPECT_EQ(at(-12, -98, 2).lobe, "occipital");
  EXPECT_EQ(at(-58, -40, 34).abbreviation, "SMG");
}

TEST(Regions, RequestedRegions) {
  const PointLabels labels = template_labels(lattice_grid(10e-3, kScalp));
  const auto regions = requested_regions(
      labels, {{"auditory right", {"STG", "transverse temporal gyrus", "pt"}, "", "right"},
               {"parietal", {}, "Parietal", ""}});
  ASSERT_EQ(regions.size(), 2u);
  EXPECT_EQ(regions[0].side, Side::right);
  for (const Eigen::Index p : regions[0].points) {
    EXPECT_EQ(labels.side[static_cast<std::size_t>(p)], Side::right);
    EXPECT_EQ(labels.gyri[static_cast<std::size_t>(labels.gyrus[static_cast<std::size_t>(p)])].lobe,
              "temporal");
  }
  EXPECT_EQ(regions[1].lobe, "parietal");
  EXPECT_GT(regions[1].points.size(), regions[0].points.size());
  const std::string message = message_of<ExperimentError>([&] {
    requested_regions(labels, {{"first", {"STGG"}, "", ""},
                               {"second", {}, "tempral", ""},
                               {"third", {"STG"}, "", "rigth"},
                               {"fourth", {"HG"}, "", "midline"},
                               {"fifth", {"PT"}, "", "midline"}});
  });
  for (const char* part :
       {"first", "STGG", "second", "tempral", "third", "rigth", "fourth", "fifth"})
    EXPECT_NE(message.find(part), std::string::npos) << part << " in: " << message;
}

/// A little atlas: label 3 right of x = 0, label 7 left; 4 mm voxels; nothing below z = 0.
void write_atlas(const std::filesystem::path& folder) {
  Volume volume;
  volume.size = {50, 60, 40};
  volume.affine_mm = Eigen::Vector4d(4, 4, 4, 1).asDiagonal();
  volume.affine_mm.topRightCorner<3, 1>() << -98, -130, -60;
  volume.values = Eigen::MatrixXd::Zero(50 * 60 * 40, 1);
  for (int k = 15; k < 40; ++k)
    for (int j = 0; j < 60; ++j)
      for (int i = 0; i < 50; ++i)
        volume.values(i + 50 * (j + 60 * k), 0) = -98 + 4 * i > 0 ? 3 : 7;
  volume.name = "labels";
  write_nifti(folder / "atlas.nii.gz", volume);
}

TEST(Regions, UsersAtlas) {
  const Scratch scratch;
  write_atlas(scratch.folder);
  std::ofstream(scratch.folder / "atlas.tsv") << "index\tname\tlobe\n3\tright half\tFrontal\n"
                                                 "7\tleft half\tn/a\n9\tunused\tn/a\n";
  const SourceGrid grid = lattice_grid(10e-3, kScalp);
  const PointLabels labels =
      atlas_labels(grid, scratch.folder / "atlas.nii.gz", scratch.folder / "atlas.tsv");
  for (Eigen::Index p = 0; p < grid.size(); ++p) {
    const auto i = static_cast<std::size_t>(p);
    if (grid.mni_m(2, p) < -2.1e-3) {
      EXPECT_EQ(labels.gyrus[i], -1);
    } else if (grid.mni_m(0, p) != 0) {
      EXPECT_EQ(labels.gyri[static_cast<std::size_t>(labels.gyrus[i])].name,
                grid.mni_m(0, p) > 0 ? "right half" : "left half");
    }
  }
  EXPECT_NE(labels.source.find("atlas.nii.gz"), std::string::npos);
  EXPECT_EQ(labels.source.find(scratch.folder.string()), std::string::npos);
  // Lobes are compared in lower case, as the template's are written.
  const auto regions = lobe_regions(labels);
  ASSERT_FALSE(regions.empty());
  EXPECT_EQ(regions[0].lobe, "frontal");
}

TEST(Regions, RefusesAtlasesThatDoNotFit) {
  const Scratch scratch;
  write_atlas(scratch.folder);
  const SourceGrid grid = lattice_grid(12e-3, kScalp);
  std::ofstream(scratch.folder / "short.tsv") << "index\tname\n7\tleft half\n";
  const std::string message = message_of<InputError>(
      [&] { atlas_labels(grid, scratch.folder / "atlas.nii.gz", scratch.folder / "short.tsv"); });
  EXPECT_NE(message.find("3"), std::string::npos) << message;
  // A volume in another space: everything outside.
  Volume elsewhere = read_nifti(scratch.folder / "atlas.nii.gz");
  elsewhere.affine_mm(0, 3) += 1000;
  write_nifti(scratch.folder / "elsewhere.nii.gz", elsewhere);
  std::ofstream(scratch.folder / "full.tsv") << "index\tname\n3\tright\n7\tleft\n";
  EXPECT_NE(message_of<InputError>([&] {
              atlas_labels(grid, scratch.folder / "elsewhere.nii.gz", scratch.folder / "full.tsv");
            }).find("MNI"),
            std::string::npos);
}

}  // namespace
}  // namespace headwater
