// SPDX-License-Identifier: GPL-3.0-or-later
// Real people's single trials, and what a bad lead or a plain beamformer does to real answers,
// where the open recordings are present. What is expected is what is published or was found
// independently of this program (the folders' README):
//   pictures      EEG Database, Begleiter, UCI, doi 10.24432/C5TS3D: N1 at 164 to 180 ms, -5 to -8
//   uV
//                 at PO7 and PO8 (average reference); change minus repeat in 200 to 280 ms: FZ
//                 -2.6, FCZ -2.2, PO7 +2.6, P7 +2.8, P8 +2.1 uV, over 16 people of whom 12 are here
//   novel-sounds  Scharf et al. 2022 Dev Cogn Neurosci 54:101072
#include "base_scratch.hpp"
#include "program.hpp"
#include "results_compare.hpp"
#include "signal_support.hpp"

#include <headwater/base/embedded_file.hpp>
#include <headwater/base/json.hpp>

#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

namespace fs = std::filesystem;

const char* const kContrasts = R"(
[[contrasts]]
name = "object"
weights = { object = 1 }
[[contrasts]]
name = "change minus repeat"
weights = { change = 1, repeat = -1 }
[[windows]]
name = "P1"
from_ms = 75
to_ms = 105
contrasts = ["object"]
[[windows]]
name = "change"
from_ms = 200
to_ms = 280
contrasts = ["change minus repeat"]
)";

/// Mean of a channel of a written waveform over a window.
double mean_of(const NumberTable& waveform, const std::string& channel, double from_s,
               double to_s) {
  const auto column = find_label_any_case(waveform.columns, channel);
  EXPECT_TRUE(column) << channel;
  double sum = 0, count = 0;
  for (Eigen::Index t = 0; column && t < waveform.values.rows(); ++t)
    if (waveform.values(t, 0) >= from_s && waveform.values(t, 0) <= to_s) {
      sum += waveform.values(t, *column);
      ++count;
    }
  return sum / count;
}

TEST(CommandOpenRecordings, PicturesFromTheirTrials) {
  NEED_OPEN_DATA(data, "pictures");
  const Scratch scratch;
  const fs::path folder = scratch.folder / "in";
  fs::create_directories(folder);
  const ProgramRun begun = run_program({"begin", data.string()}, folder);
  ASSERT_EQ(begun.exit_code, 0) << begun.err;
  expect_said(begun.out, {"12 participants", "60 channels at 256 Hz", "3 trial types"});
  std::string text = read_file(folder / "experiment.toml", "experiment");
  expect_said(text, {"zero = [\"Cz\"]", "CZ is no lead of the analysis: marked bad", "X is no lead",
                     "nd is no lead", "to_ms = 996"});
  text = text.substr(0, text.find("# The rarest minus"));
  text = with(text, "[montage]", "[inverse]\nmethods = [\"sloreta\"]\n[montage]") + kContrasts;
  write_file(folder / "pictures.toml", text);
  const ProgramRun run = run_program({"run", "pictures.toml"}, folder);
  ASSERT_EQ(run.exit_code, 0) << run.err;
  const fs::path results = folder / "results";
  expect_whole_files(results);
  // The scalp: amplitudes as found independently; over 12 of the 16 people, so within 1.5 uV.
  const NumberTable object =
      read_number_table(results / "mean/mean_contrast-object_waveform.tsv", "waveform");
  for (const char* site : {"PO7", "PO8"}) {
    double least = 0, at = 0;
    for (Eigen::Index t = 0; t < object.values.rows(); ++t)
      if (const double value = object.values(t, *find_label_any_case(object.columns, site));
          value < least && object.values(t, 0) < 0.25) {
        least = value;
        at = object.values(t, 0);
      }
    EXPECT_GT(at, 0.150) << site;
    EXPECT_LT(at, 0.195) << site;
    EXPECT_LT(least, -3.5) << site;
    EXPECT_GT(least, -9.5) << site;
  }
  const NumberTable change =
      read_number_table(results / "mean/mean_contrast-changeMinusRepeat_waveform.tsv", "waveform");
  const std::pair<const char*, double> known[] = {
      {"FZ", -2.6}, {"FCZ", -2.2}, {"PO7", 2.6}, {"P7", 2.8}, {"P8", 2.1}};
  for (const auto& [site, microvolt] : known)
    EXPECT_NEAR(mean_of(change, site, 0.2, 0.28), microvolt, 1.5) << site;
  // The P1 comes from both occipital lobes (Di Russo et al. 2002 Hum Brain Mapp 15:95).
  const Table regions =
      read_table(results / "mean/mean_contrast-object_method-sloreta_regions.tsv", "regions");
  Labels first;
  for (const auto row : rows_with(regions, {{"window", "P1"}, {"deep", "no"}}))
    if (first.size() < 2) first.push_back(regions.rows[row][regions.column("region")]);
  std::sort(first.begin(), first.end());
  EXPECT_EQ(first, (Labels{"occipital left", "occipital right"}));
}

const char* const kAverages = R"([averages]
file = "averages/{participant}_{condition}.tsv"
counts = "averages/trials.tsv"
[montage]
drop = ["X", "Y", "nd", "CZ"]
zero = ["Cz"]
[[conditions]]
name = "object"
[[conditions]]
name = "repeat"
[[conditions]]
name = "change"
[noise]
from = "residual"
after_ms = 600
[inverse]
methods = ["sloreta"]
)";

/// Adds a slow wave of 90 uV to one lead of one average: an electrode that moves.
void spoil(const fs::path& average, const std::string& lead) {
  NumberTable table = read_number_table(average, "average");
  const auto column = *find_label(table.columns, lead);
  for (Eigen::Index t = 0; t < table.values.rows(); ++t)
    table.values(t, column) += 90 * std::exp(-std::pow((table.values(t, 0) - 0.3) / 0.15, 2));
  fs::permissions(average, fs::perms::owner_write, fs::perm_options::add);
  write_file(average, number_table_text(table.columns, {}, table.values, 9));
}

TEST(CommandOpenRecordings, OneBadLeadOfOnePersonIsNamed) {
  NEED_OPEN_DATA(data, "pictures-averages");
  const Scratch scratch;
  const fs::path folder = scratch.folder / "in";
  fs::create_directories(folder);
  fs::copy(data, folder / "averages");
  write_file(folder / "experiment.toml", std::string(kAverages) + kContrasts);
  const auto peak_of = [&](const std::string& output) {
    EXPECT_EQ(run_program({"locate", "experiment.toml", "--participant", "mean", "--quiet",
                           "--contrast", "change minus repeat", "--output", output},
                          folder)
                  .exit_code,
              0);
    const Table peaks = read_table(
        folder / output / "mean/mean_contrast-changeMinusRepeat_method-sloreta_peaks.tsv", "peaks");
    return std::pair{place_mm(peaks, rows_with(peaks, {{"kind", "peak"}, {"rank", "1"}}).at(0)),
                     peaks.rows[rows_with(peaks, {{"kind", "peak"}, {"rank", "1"}}).at(0)]
                               [peaks.column("note")]};
  };
  const auto [honest, honest_note] = peak_of("honest");
  EXPECT_FALSE(holds(honest_note, "without lead")) << honest_note;
  spoil(folder / "averages" / "sub-c341_change.tsv", "FP1");
  const auto [spoiled, note] = peak_of("spoiled");
  EXPECT_GT((honest - spoiled).norm(), 50);  // the group's answer follows the one lead
  EXPECT_GT(spoiled.y(), 40);                // to the orbital cortex
  expect_said(note, {"without lead FP1 it moves", "without participant sub-c341 it moves"});
  const ProgramRun inspected =
      run_program({"inspect", "experiment.toml", "--contrast", "change minus repeat"}, folder);
  ASSERT_EQ(inspected.exit_code, 0) << inspected.err;
  expect_said(inspected.out, {"mean, change minus repeat, change: without lead FP1 it moves",
                              "sub-c341, change minus repeat, change: without lead FP1 it moves"});
  const Table influence = read_table(
      folder / "spoiled/mean/mean_contrast-changeMinusRepeat_method-sloreta_influence.tsv",
      "leads");
  const auto carriers = rows_with(influence, {{"left_out", "lead"}, {"carries", "yes"}});
  ASSERT_EQ(carriers.size(), 1u);
  EXPECT_EQ(influence.rows[carriers[0]][influence.column("name")], "FP1");
}

const char* const kSounds = R"([averages]
file = "@/{participant}_{condition}.tsv"
counts = "@/trials.tsv"
[montage]
positions = "@/electrodes.tsv"
drop = ["IO1", "LO1", "LO2"]
[[conditions]]
name = "standard"
[[conditions]]
name = "novel"
[[contrasts]]
name = "standard"
weights = { standard = 1 }
[[windows]]
name = "N1"
from_ms = 88
to_ms = 108
[inverse]
methods = ["lcmv"]
[lcmv]
from_ms = 50
to_ms = 350
)";

// The N1 of sounds comes from the transverse temporal gyri of both sides at once (Naatanen & Picton
// 1987 Psychophysiology 24:375): a plain beamformer cancels the two (Van Veen et al. 1997), the
// paired one must not.
TEST(CommandOpenRecordings, ThePairedBeamformerRecoversTheSoundResponse) {
  NEED_OPEN_DATA(data, "novel-sounds");
  const Scratch scratch;
  const fs::path folder = scratch.folder / "in";
  std::string text = kSounds;
  for (auto at = text.find('@'); at != std::string::npos; at = text.find('@', at))
    text.replace(at, 1, data.string());
  write_file(folder / "plain.toml", text);
  write_file(folder / "paired.toml", text + "mirror_paired = true\n");
  const Table gyri = parse_table(embedded_file("gyri.tsv"), "templates/gyri.tsv");
  std::map<std::string, double> away_mm;
  for (const std::string kind : {"plain", "paired"}) {
    const ProgramRun run = run_program(
        {"locate", kind + ".toml", "--participant", "mean", "--quiet", "--output", kind}, folder);
    ASSERT_EQ(run.exit_code, 0) << run.err;
    const Table peaks =
        read_table(folder / kind / "mean/mean_contrast-standard_method-lcmv_peaks.tsv", "peaks");
    const auto row = rows_with(peaks, {{"kind", "peak"}, {"rank", "1"}}).at(0);
    Eigen::Vector3d place = place_mm(peaks, row);
    place.x() = std::abs(place.x());
    away_mm[kind] = 1e9;
    for (const auto landmark : rows_with(gyri, {{"abbreviation", "HG"}}))
      away_mm[kind] = std::min(away_mm[kind], (place_mm(gyri, landmark) - place).norm());
    EXPECT_EQ(holds(peaks.rows[row][peaks.column("note")], "LCMV suppresses correlated sources"),
              kind == "plain");
  }
  EXPECT_GT(away_mm["plain"], 30);
  EXPECT_LT(away_mm["paired"], 15);
}

}  // namespace
}  // namespace headwater
