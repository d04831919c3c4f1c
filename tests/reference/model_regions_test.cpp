// SPDX-License-Identifier: GPL-3.0-or-later
// Gyri and lobes of grid points against a measured label volume: AAL (Tzourio-Mazoyer et al. 2002
// NeuroImage 15:273), as Debian's package mricron-data carries it. Skipped where it is not
// installed.
#include <headwater/base/nifti.hpp>
#include <headwater/base/units.hpp>
#include <headwater/model/regions.hpp>
#include <headwater/model/source_grid.hpp>

#include <Eigen/Geometry>
#include <Eigen/LU>
#include <gtest/gtest.h>

#include <cmath>
#include <filesystem>
#include <map>
#include <string>
#include <vector>

namespace headwater {
namespace {

const std::filesystem::path kVolume = "/usr/share/mricron/templates/aal.nii.gz";

struct Area {
  int first;  // label on the left; right: first + 1
  const char* lobe;
  const char* gyrus;  // ours of the same name, "" where the two divide differently
};

// Labels of aal.nii.txt beside the volume; lobes by the customary division (textbook), the
// paracentral lobule and the rolandic operculum with the frontal lobe as in templates/gyri.tsv.
const std::vector<Area> kAreas{
    {1, "frontal", "PreCG"},      {3, "frontal", "SFG"},        {5, "frontal", ""},
    {7, "frontal", "MFG"},        {9, "frontal", ""},           {11, "frontal", "IFGoperc"},
    {13, "frontal", "IFGtriang"}, {15, "frontal", "IFGorbit"},  {17, "frontal", ""},
    {19, "frontal", "SMA"},       {21, "frontal", ""},          {23, "frontal", "MedFG"},
    {25, "frontal", ""},          {27, "frontal", "RectG"},     {29, "insula", "Ins"},
    {31, "cingulate", "ACC"},     {33, "cingulate", "MCC"},     {35, "cingulate", "PCC"},
    {39, "temporal", "PHG"},      {43, "occipital", "CalcS"},   {45, "occipital", "Cun"},
    {47, "occipital", "LingG"},   {49, "occipital", "SOG"},     {51, "occipital", "MOG"},
    {53, "occipital", "IOG"},     {55, "temporal", "FusG"},     {57, "parietal", "PostCG"},
    {59, "parietal", "SPL"},      {61, "parietal", "IPL"},      {63, "parietal", "SMG"},
    {65, "parietal", "AngG"},     {67, "parietal", "PCun"},     {69, "frontal", "ParaCL"},
    {79, "temporal", "HG"},       {81, "temporal", "STG"},      {83, "temporal", "TempPole"},
    {85, "temporal", "MTG"},      {87, "temporal", "TempPole"}, {89, "temporal", "ITG"}};

struct Agreement {
  double lobe = 0, lobe_of = 0, gyrus = 0, gyrus_of = 0;
  std::map<std::string, std::pair<double, double>> by_lobe;  // agreeing, all with that label
};

Agreement compare() {
  const Volume volume = read_nifti(kVolume);
  const Eigen::Matrix4d to_voxel = volume.affine_mm.inverse();
  std::map<int, const Area*> area_of;
  for (const auto& area : kAreas) area_of[area.first] = area_of[area.first + 1] = &area;
  const SourceGrid grid = lattice_grid(4e-3, 0.092);
  const PointLabels labels = template_labels(grid);
  Agreement result;
  for (Eigen::Index p = 0; p < grid.size(); ++p) {
    if (labels.side[static_cast<std::size_t>(p)] == Side::midline) continue;
    const Eigen::Vector4d at = to_voxel * (grid.mni_m.col(p) / kMillimetre).homogeneous();
    Eigen::Index voxel = 0, inside = 1;
    for (int axis = 2; axis >= 0; --axis) {
      const auto i = static_cast<Eigen::Index>(std::lround(at[axis]));
      const Eigen::Index size = volume.size[static_cast<std::size_t>(axis)];
      inside = inside && i >= 0 && i < size;
      voxel = voxel * size + i;
    }
    const auto found = inside ? area_of.find(static_cast<int>(std::lround(volume.values(voxel, 0))))
                              : area_of.end();
    if (found == area_of.end()) continue;
    const Area& area = *found->second;
    const Gyrus& ours =
        labels.gyri[static_cast<std::size_t>(labels.gyrus[static_cast<std::size_t>(p)])];
    result.lobe += ours.lobe == area.lobe;
    ++result.lobe_of;
    auto& own = result.by_lobe[area.lobe];
    own.first += ours.lobe == area.lobe;
    ++own.second;
    if (*area.gyrus == '\0') continue;
    result.gyrus += ours.abbreviation == area.gyrus;
    ++result.gyrus_of;
  }
  return result;
}

TEST(TemplateLabels, AgreeWithALabelVolume) {
  if (!std::filesystem::exists(kVolume))
    GTEST_SKIP() << kVolume << " is missing: install the package mricron-data";
  const Agreement found = compare();
  ASSERT_GT(found.lobe_of, 5000);
  // Source of the figures: the agreement stated in templates/README.md, 0.94 and 0.76 in all; by
  // lobe 0.94, 0.90 to 0.92, 0.95, 0.95, 0.84, 0.87. The claim of the report is the first line
  // here.
  EXPECT_GE(found.lobe / found.lobe_of, 0.90);
  EXPECT_NEAR(found.lobe / found.lobe_of, 0.94, 0.02);
  EXPECT_NEAR(found.gyrus / found.gyrus_of, 0.76, 0.03);
  const std::map<std::string, double> stated{{"temporal", 0.94},  {"parietal", 0.91},
                                             {"frontal", 0.95},   {"occipital", 0.95},
                                             {"cingulate", 0.84}, {"insula", 0.87}};
  for (const auto& [lobe, share] : stated) {
    const auto [agreeing, all] = found.by_lobe.at(lobe);
    EXPECT_NEAR(agreeing / all, share, 0.05) << lobe;
  }
}

}  // namespace
}  // namespace headwater
