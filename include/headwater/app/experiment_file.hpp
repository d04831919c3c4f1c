// SPDX-License-Identifier: GPL-3.0-or-later
// The experiment file: what is to be analysed and how. TOML; every key in keys.hpp.
#pragma once
#include <headwater/inverse/lcmv.hpp>
#include <headwater/inverse/regularisation.hpp>
#include <headwater/model/head.hpp>
#include <headwater/model/regions.hpp>
#include <headwater/model/source_grid.hpp>
#include <headwater/signal/contrast.hpp>
#include <headwater/signal/electrodes.hpp>
#include <headwater/signal/noise_covariance.hpp>
#include <headwater/signal/regression.hpp>
#include <headwater/signal/regressors.hpp>
#include <headwater/signal/time_window.hpp>
#include <headwater/signal/trials.hpp>

#include <cstdint>
#include <filesystem>
#include <map>
#include <optional>
#include <string>
#include <vector>

namespace headwater {

struct ContrastPlan {
  std::string name;
  std::vector<ConditionWeight> weights;
  std::string predictor;  ///< coefficients of the regression in place of weights, or ""
};

/// Frame of montage.positions; own: a digitised cap that is fitted to the head.
enum class CapSpace { head, mni, own };

/// [trials], [leads], [observer] and [regression].
struct TrialPlan {
  std::string recording_pattern;                        ///< absolute, with {participant}
  TrialOptions options;                                 ///< leads.bad and leads.good apart
  std::map<std::string, Labels> bad_leads, good_leads;  ///< by participant
  std::vector<EventChoice> choices;                     ///< in the order of the conditions
  double trim = 0;                                      ///< 0: plain mean
  int blocks = 5;
  std::optional<ObserverOptions> observer;
  Labels predictors;
  RegressionOptions regression;
};

/// A checked experiment: SI units, paths absolute, every default filled in.
struct Experiment {
  std::filesystem::path file;  ///< the experiment file
  std::string title;
  std::filesystem::path output;
  std::uint64_t seed = 1;

  Labels participants;
  std::string averages_pattern;  ///< absolute, with {participant} and {condition}; "" with trials
  std::optional<std::filesystem::path> counts_table;
  double trials_each = 0;
  VoltageUnit unit = VoltageUnit::microvolt;
  TrialPlan trials;
  bool has_trials() const { return !trials.recording_pattern.empty(); }

  std::string positions = "standard";  ///< or an absolute path, possibly with {participant}
  CapSpace position_space = CapSpace::head;
  ChannelEdits edits;

  std::vector<Condition> conditions;
  std::vector<ContrastPlan> contrasts;
  std::vector<TimeWindow> windows;

  HeadModel head;  ///< radii for the given radius (92 mm until fitted)
  bool fit_radius = false;

  double spacing_m = 7e-3;
  std::optional<std::filesystem::path> points_table;
  PointSpace point_space = PointSpace::mni;
  std::optional<std::filesystem::path> atlas, atlas_table;

  NoiseOptions noise;

  Labels methods;
  RegularisationRule regularisation;
  double depth_exponent = 0.8;
  LcmvOptions lcmv;
  double lcmv_from_s = 0, lcmv_to_s = 1e9;
  bool lcmv_from_trials = false;
  std::optional<std::filesystem::path> lcmv_table;

  std::vector<RegionRequest> regions;  ///< empty: lobes by side
  bool write_series = false, write_courses = false;
};

/// Reads and checks. Throws ExperimentError that lists every problem, one a line, each with
/// file:line:column: unknown keys (with a suggestion), wrong types, values out of range, missing
/// keys, names that do not fit together, participants without files.
Experiment read_experiment(const std::filesystem::path& file);

/// The pattern with {participant} and {condition} filled in.
std::filesystem::path fill_pattern(const std::string& pattern, const std::string& participant,
                                   const std::string& condition);

/// The reverse: the text with a participant's name replaced by {participant}.
std::string general_text(const std::string& text, const std::string& participant);

/// Windows that are meant for a contrast.
std::vector<TimeWindow> windows_of(const Experiment& experiment, const std::string& contrast);

}  // namespace headwater
