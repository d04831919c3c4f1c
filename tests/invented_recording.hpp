// SPDX-License-Identifier: GPL-3.0-or-later
// Small invented recordings with events, for tests of trials.
#pragma once
#include "base_scratch.hpp"
#include "lead_support.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/edf_writing.hpp>
#include <headwater/signal/trials.hpp>

#include <fmt/core.h>

#include <string>
#include <utility>
#include <vector>

namespace headwater {

inline Montage standard_cap_montage(const Labels& labels) {
  return standard_montage(labels, 0.092);
}

/// 20 s at 200 Hz of background at 32 leads; 18 events, a second apart, of kinds a, b, a, b, ...;
/// the data may be changed before they are written.
struct InventedRecording : Scratch {
  static constexpr int rate = 200, seconds = 20;
  Labels names = thirty_two_leads();
  Eigen::MatrixXd data_uV;
  std::string events = "onset\tduration\ttrial_type\tvalue\n";
  std::vector<double> onsets_s;

  InventedRecording() {
    RandomStream random(6, "invented recording");
    data_uV = 1e6 * background(standard_cap_montage(names), 1, rate * seconds, random);
    for (int k = 0; k < 18; ++k) add_event(1 + k, k % 2 == 0 ? "a" : "b", k % 3);
  }
  void add_event(double onset_s, const std::string& kind, double value) {
    onsets_s.push_back(onset_s);
    events += fmt::format("{}\t0\t{}\t{}.0\n", onset_s, kind, value);
  }
  Eigen::Index place(const std::string& name) const { return *find_label(names, name); }
  std::filesystem::path file() const { return folder / "rec_eeg.edf"; }
  Recording write() const {
    write_edf(file(), names, rate, data_uV, {});
    write_file(folder / "rec_events.tsv", events);
    return Recording(file());
  }
  /// Half a step of the file's numbers, V.
  double rounding_V() const { return 0.5e-6 * std::ceil(data_uV.cwiseAbs().maxCoeff()) / 32767; }
};

inline std::vector<EventChoice> kinds_a_and_b() {
  return {{"A", {{"trial_type", "a"}}}, {"B", {{"trial_type", "b"}}}};
}

/// Cuts only: no lead is looked for.
inline TrialOptions plain_cut(double from_s, double to_s) {
  TrialOptions options;
  options.from_s = from_s;
  options.to_s = to_s;
  options.leads.find = false;
  return options;
}

}  // namespace headwater
