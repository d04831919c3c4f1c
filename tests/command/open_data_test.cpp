// SPDX-License-Identifier: GPL-3.0-or-later
// Real people from end to end, where the open recordings are present. What is expected is what is
// known of these responses, not what the program said once:
//   novel-sounds  Scharf, Widmann, Bonmassar & Wetzel 2022 Dev Cogn Neurosci 54:101072. The N1 of
//                 sounds is generated in and around the transverse temporal gyri of both sides
//                 (Naatanen & Picton 1987 Psychophysiology 24:375); novel sounds add activity of
//                 the upper temporal lobe of both sides (Alho 1995 Ear and Hearing 16:38).
//   pictures      EEG Database, Begleiter, UCI, doi 10.24432/C5TS3D. The P1 of pictures comes from
//                 both occipital lobes (Di Russo et al. 2002 Hum Brain Mapp 15:95).
#include "base_scratch.hpp"
#include "program.hpp"
#include "results_compare.hpp"
#include "signal_support.hpp"

#include <headwater/base/embedded_file.hpp>

#include <gtest/gtest.h>

namespace headwater {
namespace {

namespace fs = std::filesystem;

const char* const kNovelSounds = R"(title = "Novel sounds"
[averages]
file = "@/{participant}_{condition}.tsv"
counts = "@/trials.tsv"
[montage]
positions = "@/electrodes.tsv"
space = "head"
drop = ["IO1", "LO1", "LO2"]
[[conditions]]
name = "standard"
[[conditions]]
name = "novel"
[[contrasts]]
name = "standard"
weights = { standard = 1 }
[[contrasts]]
name = "novel minus standard"
weights = { novel = 1, standard = -1 }
[[windows]]
name = "N1"
from_ms = 88
to_ms = 108
contrasts = ["standard"]
[[windows]]
name = "early"
from_ms = 110
to_ms = 150
contrasts = ["novel minus standard"]
[inverse]
methods = ["sloreta"]
)";

const char* const kPictures = R"(title = "Repeated and changed pictures"
[averages]
file = "@/{participant}_{condition}.tsv"
counts = "@/trials.tsv"
[montage]
drop = ["X", "Y", "nd", "CZ"]
rename = { AF1 = "AF3", AF2 = "AF4", PO1 = "PO3", PO2 = "PO4" }
zero = ["Cz"]
[[conditions]]
name = "object"
[[conditions]]
name = "repeat"
[[conditions]]
name = "change"
[[contrasts]]
name = "object"
weights = { object = 1 }
[[windows]]
name = "P1"
from_ms = 75
to_ms = 105
contrasts = ["object"]
[noise]
from = "residual"
after_ms = 600
[inverse]
methods = ["sloreta"]
)";

std::string filled(std::string text, const fs::path& data) {
  for (auto at = text.find('@'); at != std::string::npos; at = text.find('@', at))
    text.replace(at, 1, data.string());
  return text;
}

/// Landmarks of a gyrus, on the right (the table's x is the distance from the midline).
std::vector<Eigen::Vector3d> landmarks_mm(const std::string& gyrus) {
  const Table table = parse_table(embedded_file("gyri.tsv"), "templates/gyri.tsv");
  std::vector<Eigen::Vector3d> places;
  for (const auto row : rows_with(table, {{"abbreviation", gyrus}}))
    places.push_back(place_mm(table, row));
  return places;
}

double distance_mm(const std::vector<Eigen::Vector3d>& places, const Eigen::Vector3d& to) {
  double nearest = 1e9;
  for (const auto& place : places) nearest = std::min(nearest, (place - to).norm());
  return nearest;
}

Labels first_regions(const fs::path& regions, const std::string& window, std::size_t count) {
  const Table table = read_table(regions, "regions");
  Labels names;
  for (const auto row : rows_with(table, {{"window", window}, {"deep", "no"}}))
    if (names.size() < count) names.push_back(table.rows[row][table.column("region")]);
  return names;
}

TEST(CommandOpenData, SoundsAreHeardInBothTransverseTemporalGyri) {
  NEED_OPEN_DATA(data, "novel-sounds");
  const Scratch scratch;
  write_file(scratch.folder / "in" / "experiment.toml", filled(kNovelSounds, data));
  const ProgramRun run = run_program({"run", "experiment.toml", "--quiet"}, scratch.folder / "in");
  ASSERT_EQ(run.exit_code, 0) << run.err;
  const fs::path results = scratch.folder / "in" / "results";
  expect_whole_files(results);
  const Table summary = read_table(results / "summary.tsv", "summary");
  const auto heschl = landmarks_mm("HG");
  ASSERT_FALSE(heschl.empty());
  Labels people;
  int near = 0;
  for (const auto& row : summary.rows)
    if (const auto& who = row[0]; !find_label(people, who)) people.push_back(who);
  EXPECT_EQ(people.size(), 25u);  // 24 and their mean
  for (const auto row : rows_with(summary, {{"window", "N1"}, {"kind", "mirrored pair"}})) {
    const double away = distance_mm(heschl, place_mm(summary, row));
    if (summary.rows[row][0] == "mean")
      EXPECT_LT(away, 15);
    else
      near += away < 15;
  }
  // By chance one of 24: 54 of the 1457 lattice points of a side lie within 15 mm of a landmark.
  EXPECT_GE(near, 12);
  const auto mean_pair =
      rows_with(summary, {{"participant_id", "mean"}, {"window", "N1"}, {"kind", "mirrored pair"}});
  EXPECT_EQ(mean_pair.size(), 1u);
  const auto mean_peak =
      rows_with(summary, {{"participant_id", "mean"}, {"window", "N1"}, {"kind", "peak"}});
  ASSERT_EQ(mean_peak.size(), 1u);
  EXPECT_TRUE(holds(summary.rows[mean_peak[0]][summary.column("note")], "mirrored pair"));
  for (const auto& [contrast, window] :
       {std::pair{"standard", "N1"}, {"novelMinusStandard", "early"}}) {
    const Labels first = first_regions(
        results / fmt::format("mean/mean_contrast-{}_method-sloreta_regions.tsv", contrast), window,
        100);
    for (const std::string side : {" left", " right"}) {
      const auto strongest = std::find_if(
          first.begin(), first.end(), [&](const auto& region) { return region.ends_with(side); });
      ASSERT_NE(strongest, first.end());
      EXPECT_EQ(*strongest, "temporal" + side) << contrast;
    }
  }
}

TEST(CommandOpenData, PicturesAreSeenInBothOccipitalLobes) {
  NEED_OPEN_DATA(data, "pictures-averages");
  const Scratch scratch;
  write_file(scratch.folder / "in" / "experiment.toml", filled(kPictures, data));
  const ProgramRun run = run_program({"run", "experiment.toml", "--quiet"}, scratch.folder / "in");
  ASSERT_EQ(run.exit_code, 0) << run.err;
  const fs::path results = scratch.folder / "in" / "results";
  expect_whole_files(results);
  Labels first =
      first_regions(results / "mean/mean_contrast-object_method-sloreta_regions.tsv", "P1", 2);
  std::sort(first.begin(), first.end());
  EXPECT_EQ(first, (Labels{"occipital left", "occipital right"}));
}

}  // namespace
}  // namespace headwater
