// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/results_tables.hpp"

#include <headwater/app/results_folder.hpp>
#include <headwater/base/atomic_file.hpp>
#include <headwater/base/nifti.hpp>
#include <headwater/base/units.hpp>
#include <headwater/base/version.hpp>
#include <headwater/base/vtk_grid.hpp>
#include <headwater/signal/reference.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <cmath>

namespace headwater {
namespace {

namespace fs = std::filesystem;

/// 64-bit FNV-1a of a file's bytes, in hexadecimal: tells whether an input has changed.
std::string content_hash(const fs::path& file) {
  std::uint64_t hash = 0xcbf29ce484222325u;
  for (const char byte : read_file(file, "input")) {
    hash ^= static_cast<unsigned char>(byte);
    hash *= 0x100000001b3u;
  }
  return fmt::format("{:016x}", hash);
}

/// Values on the lattice as a volume of one or more times.
Volume source_volume(const ForwardModel& forward, const Eigen::Ref<const Eigen::MatrixXd>& values,
                     const SourceOperator& inverse, const std::string& description) {
  Volume volume = lattice_volume(forward.grid);
  volume.values = Eigen::MatrixXd::Zero(volume.values.rows(), values.cols());
  const auto voxels = lattice_voxels(forward.grid);
  for (std::size_t p = 0; p < voxels.size(); ++p)
    volume.values.row(voxels[p]) = values.row(static_cast<Eigen::Index>(p)) / inverse.unit_in_SI;
  volume.name = inverse.quantity;
  volume.unit = inverse.unit;
  volume.description = description;
  return volume;
}

std::string with_suffix(const fs::path& base, const char* suffix) {
  return base.string() + suffix;
}

/// The whole series: a 4-D NIfTI, and a VTI for each sample with its time index. base: without
/// suffix.
void write_series(const fs::path& base, const ContrastWaveform& contrast,
                  const LocatedContrast& located, const ForwardModel& forward) {
  Volume series = source_volume(forward, located.estimate.amplitude, located.inverse,
                                contrast.name + ", " + located.inverse.method);
  series.first_time_s = contrast.times_s[0];
  series.time_step_s = contrast.times_s.size() > 1 ? contrast.times_s[1] - contrast.times_s[0] : 0;
  write_nifti(with_suffix(base, "_series.nii.gz"), series);
  std::vector<std::pair<double, std::string>> steps;
  for (Eigen::Index t = 0; t < contrast.times_s.size(); ++t) {
    const fs::path step = with_suffix(base, "_series") + fmt::format("/{:04d}.vti", t);
    write_vti(step, series, t);
    steps.emplace_back(contrast.times_s[t],
                       step.lexically_relative(base.parent_path()).generic_string());
  }
  write_pvd(with_suffix(base, "_series.pvd"), steps);
}

/// Source courses with their three components, 17 digits. base: without suffix.
void write_source_courses(const fs::path& base, const ContrastWaveform& contrast,
                          const LocatedContrast& located, const ForwardModel& forward) {
  Labels columns{"time_s"};
  for (Eigen::Index p = 0; p < forward.grid.size(); ++p) {
    const std::string name = forward.grid.names.empty()
                                 ? fmt::format("p{}", p + 1)
                                 : forward.grid.names[static_cast<std::size_t>(p)];
    for (const char* axis : {"_x", "_y", "_z"}) columns.push_back(name + axis);
  }
  Labels times;
  for (const double t : contrast.times_s) times.push_back(format_number(t, 17));
  write_file(
      with_suffix(base, ".tsv"),
      number_table_text(columns, times,
                        located.estimate.components.transpose() / located.inverse.unit_in_SI, 17));
  Json note = Json::object();
  note.set("Description",
           "Source courses: for each point of points.tsv its components to the right (_x), "
           "forwards (_y) and upwards (_z).");
  note.set("Quantity", located.inverse.quantity);
  note.set("Units", located.inverse.unit.empty() ? "multiples of the noise" : located.inverse.unit);
  write_json(with_suffix(base, ".json"), note);
}

/// Values (#channels by #times, V) of a contrast's channels.
OutputTable channel_table(const std::string& what, const ContrastWaveform& contrast,
                          const Eigen::MatrixXd& values_V, bool full_precision) {
  OutputTable table{what, {{"time_s", "Latency", "s"}}, {}};
  for (const auto& channel : contrast.channels)
    table.columns.push_back({channel, "Potential against the average of all channels", "uV"});
  for (Eigen::Index t = 0; t < contrast.times_s.size(); ++t) {
    std::vector<std::string> row{format_number(contrast.times_s[t], full_precision ? 17 : 9)};
    for (Eigen::Index m = 0; m < values_V.rows(); ++m)
      row.push_back(format_number(values_V(m, t) / kMicrovolt, full_precision ? 17 : 6));
    table.rows.push_back(std::move(row));
  }
  return table;
}

}  // namespace

fs::path ResultsFolder::file(const std::string& participant, const std::string& contrast,
                             const std::string& method, const std::string& window,
                             const std::string& suffix) const {
  std::string name = fmt::format("{}_contrast-{}", participant, file_label(contrast));
  if (!method.empty()) name += fmt::format("_method-{}", file_label(method));
  if (!window.empty()) name += fmt::format("_window-{}", file_label(window));
  return root_ / participant / fmt::format("{}_{}", name, suffix);
}

void ResultsFolder::write_description(const std::string& title) const {
  Json by = Json::object();
  by.set("Name", "Headwater").set("Version", version());
  Json json = Json::object();
  json.set("Name", title.empty() ? std::string("Sources") : title)
      .set("BIDSVersion", "1.8.0")
      .set("DatasetType", "derivative")
      .set("GeneratedBy", Json::Array{by})
      .set("Caution", caution());
  write_json(root_ / "dataset_description.json", json);
}

void ResultsFolder::write_forward(const ForwardModel& forward,
                                  const std::string& participant) const {
  const std::string start = participant.empty() ? "" : fmt::format("{0}/{0}_", participant);
  write_table(root_ / (start + "grid.tsv"), grid_table(forward));
  Labels names = forward.grid.names;
  for (Eigen::Index p = 0; names.size() < static_cast<std::size_t>(forward.grid.size()); ++p)
    names.push_back(fmt::format("p{}", p + 1));
  write_table(root_ / (start + "points.tsv"),
              positions_table("Source points", names, forward.grid.head_m));
  write_table(root_ / (start + "electrodes.tsv"),
              positions_table("Electrodes", forward.montage.labels, forward.montage.positions));
}

void ResultsFolder::write_data_decisions(const ParticipantData& participant) const {
  const auto path = [&](const std::string& suffix) {
    return root_ / participant.name / fmt::format("{}_{}", participant.name, suffix);
  };
  if (!participant.leads.leads.empty()) write_table(path("leads.tsv"), lead_table(participant));
  if (participant.cap.fit) write_json(path("cap.json"), cap_json(participant.cap));
  if (!participant.trials) return;
  write_table(path("trials.tsv"), trial_table(participant));
  if (!participant.trials->regression.names.empty())
    write_table(path("regression.tsv"), regression_table(participant));
}

void ResultsFolder::write_standard_error(const ParticipantData& participant,
                                         const ContrastWaveform& contrast,
                                         const std::string& predictor) const {
  const auto& regression = participant.trials->regression;
  const auto place = find_label(regression.names, predictor);
  if (!place) return;
  write_table(file(participant.name, contrast.name, "", "", "standardError.tsv"),
              channel_table(
                  "Standard error of the coefficients, from the residuals of the regression.",
                  contrast, regression.standard_error_V[static_cast<std::size_t>(*place)], false));
}

void ResultsFolder::write_waveform(const std::string& participant, const ContrastWaveform& contrast,
                                   bool full_precision) const {
  write_table(file(participant, contrast.name, "", "", "waveform.tsv"),
              channel_table("Contrast waveform, average reference.", contrast, contrast.data_V,
                            full_precision));
}

void ResultsFolder::write_dipoles(const std::string& participant, const ContrastWaveform& contrast,
                                  const ForwardModel& forward,
                                  const std::vector<WindowDipoles>& dipoles) const {
  write_table(file(participant, contrast.name, "", "", "dipoles.tsv"),
              dipole_table(forward, contrast, dipoles));
  write_table(file(participant, contrast.name, "", "", "influence.tsv"),
              influence_table(forward, dipoles));
}

void ResultsFolder::write_noise(const std::string& participant,
                                const ContrastWaveform& contrast) const {
  // B C B': what the noise of the contrast looks like against the average reference.
  const Eigen::MatrixXd basis =
      reference_free_basis(static_cast<Eigen::Index>(contrast.channels.size()));
  const Eigen::MatrixXd covariance = basis * contrast.noise_V2 * basis.transpose();
  OutputTable table{
      "Noise covariance of the contrast, average reference.", {{"name", "Channel", ""}}, {}};
  for (const auto& channel : contrast.channels)
    table.columns.push_back({channel, "Covariance with this channel", "uV^2"});
  for (Eigen::Index m = 0; m < covariance.rows(); ++m) {
    std::vector<std::string> row{contrast.channels[static_cast<std::size_t>(m)]};
    for (Eigen::Index k = 0; k < covariance.cols(); ++k)
      row.push_back(format_number(covariance(m, k) / (kMicrovolt * kMicrovolt), 17));
    table.rows.push_back(std::move(row));
  }
  write_table(file(participant, contrast.name, "", "", "noise.tsv"), table);
}

std::vector<SummaryRow> ResultsFolder::write_located(
    const Experiment& experiment, const ParticipantData& participant,
    const ContrastWaveform& contrast, const LocatedContrast& located,
    const std::vector<WindowDipoles>& dipoles) const {
  const auto& forward = *participant.forward;
  const auto& method = located.inverse.method;
  const auto path = [&](const std::string& window, const std::string& suffix) {
    return file(participant.name, contrast.name, method, window, suffix);
  };
  write_table(path("", "peaks.tsv"), peak_table(forward, located, dipoles));
  write_table(path("", "regions.tsv"), region_table(forward, located));
  write_table(path("", "regionCourses.tsv"), region_course_table(forward, contrast, located));
  write_table(path("", "indices.tsv"), index_table(located));
  write_table(path("", "influence.tsv"), influence_table(forward, located));
  write_json(path("", "fit.json"), fit_json(participant, contrast, located));
  if (forward.grid.is_lattice()) {
    for (const auto& window : located.windows) {
      const Volume map = source_volume(
          forward, window.map, located.inverse,
          fmt::format("{}, {}, {:g}-{:g} ms", contrast.name, method,
                      window.window.from_s / kMillisecond, window.window.to_s / kMillisecond));
      const fs::path base = path(window.window.name, "sources");
      write_vti(with_suffix(base, ".vti"), map);
      write_nifti(with_suffix(base, ".nii.gz"), map);
    }
    if (experiment.write_series) write_series(path("", "sources"), contrast, located, forward);
  }
  if (experiment.write_courses)
    write_source_courses(path("", "sourceCourses"), contrast, located, forward);
  return summarise(participant, contrast, located, dipoles);
}

void ResultsFolder::write_summary(const std::vector<SummaryRow>& rows, bool keep_others) const {
  OutputTable table = summary_table(rows);
  const fs::path file = root_ / "summary.tsv";
  if (keep_others && fs::exists(file)) {
    const Table earlier = read_table(file, "summary");
    const auto same_work = [](const auto& a, const auto& b) {
      return a[0] == b[0] && a[1] == b[1] && a[2] == b[2];  // participant, contrast, method
    };
    std::vector<std::vector<std::string>> kept;
    for (const auto& old : earlier.rows)
      if (earlier.columns.size() == table.columns.size() &&
          std::none_of(table.rows.begin(), table.rows.end(),
                       [&](const auto& row) { return same_work(row, old); }))
        kept.push_back(old);
    table.rows.insert(table.rows.begin(), kept.begin(), kept.end());
  }
  write_table(file, table);
}

void ResultsFolder::write_provenance(const Experiment& experiment,
                                     const std::vector<std::string>& inputs) const {
  const fs::path folder = fs::absolute(experiment.file).parent_path();
  Json files = Json::array();
  const auto add = [&](const fs::path& path) {
    Json entry = Json::object();
    entry.set("File", path.lexically_relative(folder).generic_string())
        .set("Fnv1a64", content_hash(path));
    files.push(entry);
  };
  add(fs::absolute(experiment.file));
  for (const auto& input : inputs) add(input);
  Json json = Json::object();
  json.set("Program", "Headwater")
      .set("Version", version())
      .set("Seed", static_cast<long long>(experiment.seed))
      .set("Inputs", files)
      .set("Caution", caution());
  write_json(root_ / "provenance.json", json);
}

}  // namespace headwater
