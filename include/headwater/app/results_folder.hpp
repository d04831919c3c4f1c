// SPDX-License-Identifier: GPL-3.0-or-later
// The results folder: names, tables and volumes, laid out like a BIDS derivative.
//
//   results/dataset_description.json  provenance.json  summary.tsv
//           grid.tsv  points.tsv  electrodes.tsv             (of each participant where caps
//           differ) sub-01/sub-01_contrast-<label>_waveform.tsv      average reference, uV
//                  sub-01_contrast-<label>_dipoles.tsv       one point or a mirrored pair
//                  sub-01_contrast-<label>_influence.tsv     of each lead, block, participant
//                  sub-01_leads.tsv  _trials.tsv  _regression.tsv  _cap.json
//                  sub-01_contrast-<label>_method-<m>_peaks.tsv  _regions.tsv  _regionCourses.tsv
//                                                     _indices.tsv  _influence.tsv  _fit.json
//                  sub-01_contrast-<label>_method-<m>_window-<label>_sources.vti  .nii.gz
//           mean/...                                         the mean over participants
// Volumes are in MNI space. Nothing names a person, a user, a host or an absolute path.
#pragma once
#include <headwater/app/located.hpp>
#include <headwater/base/json.hpp>
#include <headwater/base/table.hpp>

#include <filesystem>
#include <string>
#include <vector>

namespace headwater {

/// One line of summary.tsv, and of what `locate` prints.
struct SummaryRow {
  std::string participant, contrast, method, window;
  std::string kind;                                 ///< "mirrored pair" or "peak"
  Eigen::Vector3d mni_m = Eigen::Vector3d::Zero();  ///< right half of a pair
  std::string side, gyrus, lobe;
  double value = 0;  ///< in `unit`
  std::string unit;
  double latency_s = 0;
  double explained_variance = 0;  ///< 0 to 1; NaN where the method defines none
  double snr = 0;
  std::string strongest_regions;  ///< three names, largest rms first
  std::string note;
};

/// File names and writers for one results folder.
class ResultsFolder {
 public:
  explicit ResultsFolder(std::filesystem::path root) : root_(std::move(root)) {}

  const std::filesystem::path& root() const { return root_; }
  /// results/<participant>/<participant>_contrast-<label>[_method-<m>][_window-<label>]_<suffix>.
  std::filesystem::path file(const std::string& participant, const std::string& contrast,
                             const std::string& method, const std::string& window,
                             const std::string& suffix) const;

  /// dataset_description.json, and grid, points and electrodes of a forward model: in the root, or
  /// in a participant's folder when caps differ.
  void write_description(const std::string& title) const;
  void write_forward(const ForwardModel& forward, const std::string& participant) const;
  /// Leads, trials, regression and cap of a participant: what was decided, with the figures.
  void write_data_decisions(const ParticipantData& participant) const;
  /// Standard errors of a predictor's coefficients, uV.
  void write_standard_error(const ParticipantData& participant, const ContrastWaveform& contrast,
                            const std::string& predictor) const;
  void write_waveform(const std::string& participant, const ContrastWaveform& contrast,
                      bool full_precision) const;
  void write_dipoles(const std::string& participant, const ContrastWaveform& contrast,
                     const ForwardModel& forward, const std::vector<WindowDipoles>& dipoles) const;
  void write_noise(const std::string& participant, const ContrastWaveform& contrast) const;
  /// Peaks, regions, courses, indices, fit, maps of one method; returns the summary.
  std::vector<SummaryRow> write_located(const Experiment& experiment,
                                        const ParticipantData& participant,
                                        const ContrastWaveform& contrast,
                                        const LocatedContrast& located,
                                        const std::vector<WindowDipoles>& dipoles) const;
  /// keep_others: rows of an earlier summary.tsv stay unless their participant, contrast and method
  /// are among the new ones (a run over a selection).
  void write_summary(const std::vector<SummaryRow>& rows, bool keep_others) const;
  void write_provenance(const Experiment& experiment, const std::vector<std::string>& inputs) const;

 private:
  std::filesystem::path root_;
};

OutputTable summary_table(const std::vector<SummaryRow>& rows);
Json summary_json(const std::vector<SummaryRow>& rows);

}  // namespace headwater
