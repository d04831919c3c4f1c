// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/app/figures.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/nifti.hpp>
#include <headwater/base/units.hpp>
#include <headwater/view/source_picture.hpp>

#include <Eigen/Geometry>
#include <Eigen/LU>
#include <fmt/core.h>

#include <cmath>

namespace headwater {
namespace {

namespace fs = std::filesystem;

Eigen::Matrix3Xd coordinates(const Table& table) {
  const std::size_t axes[] = {table.column("x_mm"), table.column("y_mm"), table.column("z_mm")};
  Eigen::Matrix3Xd points(3, static_cast<Eigen::Index>(table.rows.size()));
  for (std::size_t row = 0; row < table.rows.size(); ++row)
    for (Eigen::Index axis = 0; axis < 3; ++axis)
      points(axis, static_cast<Eigen::Index>(row)) = table.number(row, axes[axis]);
  return points;
}

/// The participant's own file where there is one (caps differ), else the one of all.
fs::path own_or_shared(const fs::path& root, const std::string& participant, const char* name) {
  const fs::path own = root / participant / fmt::format("{}_{}", participant, name);
  return fs::exists(own) ? own : root / name;
}

void add_map(SourcePicture& picture, const fs::path& file, const fs::path& grid_file) {
  picture.points_mni_mm = coordinates(read_table(grid_file, "source grid"));
  const Volume volume = read_nifti(file);
  const Eigen::Matrix4d to_voxel = volume.affine_mm.inverse();
  picture.values.resize(picture.points_mni_mm.cols());
  for (Eigen::Index p = 0; p < picture.values.size(); ++p) {
    const Eigen::Vector4d at = to_voxel * picture.points_mni_mm.col(p).homogeneous();
    const auto voxel = [&](int axis) { return static_cast<Eigen::Index>(std::lround(at[axis])); };
    picture.values[p] =
        volume.values(voxel(0) + volume.size[0] * (voxel(1) + volume.size[1] * voxel(2)), 0);
  }
  picture.spacing_mm = volume.affine_mm(0, 0);
}

void add_marks(SourcePicture& picture, const fs::path& peaks_file, const std::string& window) {
  const Table peaks = read_table(peaks_file, "peaks");
  const Eigen::Matrix3Xd places = coordinates(peaks);
  const auto cell = [&](std::size_t row, const char* column) {
    return peaks.rows[row][peaks.column(column)];
  };
  bool peak_marked = false, false_peak = false;
  for (std::size_t row = 0; row < peaks.rows.size(); ++row) {
    const bool pair = cell(row, "kind") == "mirrored pair";
    if (cell(row, "window") != window || (!pair && peak_marked)) continue;
    PictureMark mark;
    mark.mni_mm = places.col(static_cast<Eigen::Index>(row));
    mark.pair = pair;
    mark.label = fmt::format("{}", pair ? (mark.mni_mm.x() < 0 ? 'L' : 'R') : 'M');
    const std::string unit = cell(row, "unit") == "n/a" ? "" : " " + cell(row, "unit");
    mark.caption = fmt::format("{}  {} {} {} ({:.0f}, {:.0f}, {:.0f}) mm, {:.3g}{}", mark.label,
                               pair ? "pair," : "maximum,", cell(row, "side"), cell(row, "gyrus"),
                               mark.mni_mm.x(), mark.mni_mm.y(), mark.mni_mm.z(),
                               peaks.number(row, peaks.column("value")), unit);
    if (!pair) {
      false_peak = cell(row, "note").rfind("likely false", 0) == 0;
      mark.caption += fmt::format(", {:.0f} ms{}", peaks.number(row, peaks.column("latency_ms")),
                                  false_peak ? ", likely false" : "");
      if (!false_peak && cell(row, "note") != "n/a")
        picture.notes.push_back(fmt::format("M: {}.", cell(row, "note")));
      peak_marked = true;
    }
    picture.marks.push_back(mark);
  }
  if (false_peak)
    picture.notes.push_back(
        "A mirrored pair of dipoles explains the scalp map better than any one point: the "
        "map's maximum M is likely two symmetric generators merged.");
}

void add_scalp(SourcePicture& picture, const fs::path& waveform_file,
               const fs::path& electrodes_file, const TimeWindow& window) {
  const NumberTable waveform = read_number_table(waveform_file, "contrast waveform");
  const SampleRange samples = samples_in(waveform.values.col(0), window);
  picture.channels.assign(waveform.columns.begin() + 1, waveform.columns.end());
  picture.scalp_uV = waveform.values.middleRows(samples.first, samples.count)
                         .rightCols(waveform.values.cols() - 1)
                         .colwise()
                         .mean();
  const Table electrodes = read_table(electrodes_file, "electrodes");
  const Eigen::Matrix3Xd positions = coordinates(electrodes);
  Labels names;
  for (const auto& row : electrodes.rows) names.push_back(row[electrodes.column("name")]);
  const auto places = match_labels(picture.channels, names, electrodes.source);
  picture.directions.resize(3, static_cast<Eigen::Index>(places.size()));
  for (std::size_t k = 0; k < places.size(); ++k)
    picture.directions.col(static_cast<Eigen::Index>(k)) = positions.col(places[k]);
}

fs::path draw_one(const Experiment& experiment, const ResultsFolder& results,
                  const std::string& participant, const std::string& contrast,
                  const std::string& method, const TimeWindow& window) {
  const fs::path map = results.file(participant, contrast, method, window.name, "sources.nii.gz");
  if (!fs::exists(map))
    throw InputError(
        fmt::format("There is no {}: run `headwater locate` first (maps are written for the "
                    "lattice, not for points of your own).",
                    map.string()));
  const Json fit =
      read_json(results.file(participant, contrast, method, "", "fit.json"), "fit of the estimate");
  SourcePicture picture;
  picture.title = fmt::format("{}, {:g} to {:g} ms ({})", contrast, window.from_s / kMillisecond,
                              window.to_s / kMillisecond, window.name);
  picture.subtitle =
      fmt::format("{}{} · {} · regularisation: {}",
                  experiment.title.empty() ? "" : fmt::format("{} · ", experiment.title),
                  participant == kMeanName ? "mean over participants" : participant, method,
                  fit.find("Regularisation")->find("Rule")->text());
  picture.value_name = fit.find("Quantity")->text();
  picture.unit = fit.find("Unit")->is_null() ? "" : fit.find("Unit")->text();
  add_map(picture, map, own_or_shared(results.root(), participant, "grid.tsv"));
  add_marks(picture, results.file(participant, contrast, method, "", "peaks.tsv"), window.name);
  add_scalp(picture, results.file(participant, contrast, "", "", "waveform.tsv"),
            own_or_shared(results.root(), participant, "electrodes.tsv"), window);
  picture.notes.push_back(
      "Template head, spherical model: read positions in centimetres. Research use only.");
  fs::path file = results.root() / "figures" / map.filename();
  file.replace_extension().replace_extension(".png");
  write_source_picture(file, picture);
  return file;
}

}  // namespace

std::vector<fs::path> draw_figures(const Experiment& experiment, const StageOptions& options) {
  const ResultsFolder results(experiment.output);
  const Labels people = options.participants.empty() ? Labels{kMeanName} : options.participants;
  std::vector<fs::path> files;
  for (const auto& participant : people)
    for (const auto& plan : experiment.contrasts)
      for (const auto& method : experiment.methods)
        for (const auto& window : windows_of(experiment, plan.name)) {
          files.push_back(draw_one(experiment, results, participant, plan.name, method, window));
          if (options.finished) options.finished(files.back().filename().string());
        }
  return files;
}

}  // namespace headwater
