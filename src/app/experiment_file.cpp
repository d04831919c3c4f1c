// SPDX-License-Identifier: GPL-3.0-or-later
// Over 400 lines: one method for each section of the file.
#include "app/key_reader.hpp"
#include "app/trial_keys.hpp"

#include <headwater/app/experiment_file.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/table.hpp>
#include <headwater/base/units.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <set>

namespace headwater {
namespace {

namespace fs = std::filesystem;

std::string replace_all(std::string text, const std::string& what, const std::string& with) {
  for (auto at = text.find(what); at != std::string::npos; at = text.find(what, at + with.size()))
    text.replace(at, what.size(), with);
  return text;
}

/// Reads one section after the other into the experiment; problems go to the reader.
class Assembly {
 public:
  Assembly(KeyReader& keys, Experiment& experiment)
      : keys_(keys), out_(experiment), folder_(fs::absolute(experiment.file).parent_path()) {}

  void run() {
    out_.title = keys_.text("title");
    out_.output = absolute(keys_.text("output"));
    out_.seed = static_cast<std::uint64_t>(keys_.number("seed"));
    read_averages();
    read_conditions();
    read_trial_keys(keys_, out_, folder_);
    read_participants();
    check_lead_lists();
    read_contrasts();
    read_windows();
    read_montage();
    read_head();
    read_grid();
    read_noise();
    read_inverse();
    read_regions();
    out_.write_series = keys_.flag("files.series");
    out_.write_courses = keys_.flag("files.courses");
  }

 private:
  fs::path absolute(const std::string& text) const { return (folder_ / text).lexically_normal(); }

  std::optional<fs::path> optional_path(const std::string& key) {
    if (!keys_.has(key) || keys_.text(key).empty()) return {};
    fs::path path = absolute(keys_.text(key));
    if (!fs::exists(path))
      keys_.problem(keys_.find(key), fmt::format("'{}': there is no file {}.", key, path.string()));
    return path;
  }

  void read_averages() {
    const std::string pattern = keys_.text("averages.file");
    out_.averages_pattern = pattern.empty() ? "" : absolute(pattern).string();
    for (const char* part : {"{participant}", "{condition}"})
      if (!pattern.empty() && pattern.find(part) == std::string::npos)
        keys_.problem(
            keys_.find("averages.file"),
            fmt::format("'averages.file' lacks {}: the name of each file must say it.", part));
    if (const auto* counts = keys_.find("averages.counts")) {
      if (counts->is_number())
        out_.trials_each = counts->number();
      else
        out_.counts_table = optional_path("averages.counts");
    }
    const std::string unit = fold_case(keys_.text("averages.unit"));
    out_.unit = unit == "v"    ? VoltageUnit::volt
                : unit == "mv" ? VoltageUnit::millivolt
                               : VoltageUnit::microvolt;
  }

  void read_conditions() {
    for (const auto* entry : keys_.entries("conditions")) {
      Condition condition{text_of(*entry, "name"), {}};
      for (const auto& [key, value] : std::get<TomlValue::Table>(entry->value))
        if (key != "name" && key != "events" && value.is_text())
          condition.factors[key] = std::get<std::string>(value.value);
      for (const auto& other : out_.conditions)
        if (other.name == condition.name)
          keys_.problem(entry, fmt::format("condition '{}' is there twice.", condition.name));
      out_.conditions.push_back(condition);
    }
    if (out_.conditions.empty())
      keys_.problem(nullptr,
                    "no [[conditions]]: name at least one, as in the file names or the events.");
  }

  void read_participants() {
    if (const auto table = optional_path("participants.table")) {
      if (!fs::exists(*table)) return;
      try {
        const Table list = read_table(*table, "participants table");
        const auto column = list.column("participant_id");
        for (const auto& row : list.rows) out_.participants.push_back(row[column]);
      } catch (const Error& error) {
        keys_.problem(keys_.find("participants.table"), error.what());
      }
      for (const auto& repeated : repeated_labels(out_.participants))
        keys_.problem(keys_.find("participants.table"),
                      fmt::format("participant '{}' is in the table twice.", repeated));
    } else {
      find_participants();
    }
    for (const auto& name : keys_.texts("participants.leave_out")) {
      const auto found = std::find(out_.participants.begin(), out_.participants.end(), name);
      if (found == out_.participants.end())
        keys_.problem(keys_.find("participants.leave_out"),
                      fmt::format("there is no participant '{}' to leave out.{}", name,
                                  did_you_mean(name, out_.participants)));
      else
        out_.participants.erase(found);
    }
    for (const auto& name : out_.participants)
      if (name == "mean" || name == "n/a" || name.empty() || name[0] == '.' ||
          name.find('/') != std::string::npos)
        keys_.problem(
            keys_.find(keys_.has("participants.table") ? "participants.table" : files_key()),
            fmt::format("'{}' cannot name a participant: it would not make a folder of its own "
                        "('mean' is the mean over participants). Rename it, or name it in "
                        "participants.leave_out.",
                        name));
    if (out_.participants.empty() && keys_.problems().empty())
      keys_.problem(keys_.find(files_key()),
                    fmt::format("no participant: no file fits {}.", files_pattern()));
  }

  std::string files_key() const { return out_.has_trials() ? "trials.recording" : "averages.file"; }
  const std::string& files_pattern() const {
    return out_.has_trials() ? out_.trials.recording_pattern : out_.averages_pattern;
  }

  /// Participants of whom a file of the first condition is there. {participant} may stand in one
  /// component of the path more than once, or in several.
  void find_participants() {
    if (files_pattern().empty() || out_.conditions.empty()) return;
    const std::string pattern =
        replace_all(files_pattern(), "{condition}", out_.conditions[0].name);
    const auto at = pattern.find("{participant}");
    if (at == std::string::npos) return;
    const auto slash = pattern.rfind('/', at);
    const fs::path folder = pattern.substr(0, slash);
    const std::string prefix = pattern.substr(slash + 1, at - slash - 1);
    std::error_code failed;
    std::set<std::string> found;
    for (const auto& entry : fs::directory_iterator(folder, failed)) {
      const std::string name = entry.path().filename().string();
      if (name.rfind(prefix, 0) != 0) continue;
      // Every possible length: the one whose filled-in pattern exists is the participant.
      for (std::size_t length = 1; length + prefix.size() <= name.size(); ++length) {
        const std::string who = name.substr(prefix.size(), length);
        if (fs::exists(replace_all(pattern, "{participant}", who), failed)) found.insert(who);
      }
    }
    out_.participants.assign(found.begin(), found.end());
  }

  /// Leads are fixed for people who are there.
  void check_lead_lists() {
    for (const auto& [key, lists] : {std::pair{"leads.bad", &out_.trials.bad_leads},
                                     std::pair{"leads.good", &out_.trials.good_leads}})
      for (const auto& [name, leads] : *lists)
        if (!find_label(out_.participants, name) &&
            !find_label(keys_.texts("participants.leave_out"), name))
          keys_.problem(keys_.find(key),
                        fmt::format("'{}' names participant '{}', who is not there.{}", key, name,
                                    did_you_mean(name, out_.participants)));
  }

  void read_contrasts() {
    for (const auto* entry : keys_.entries("contrasts")) {
      ContrastPlan plan{text_of(*entry, "name"), {}, text_of(*entry, "predictor")};
      const auto *weights = entry->find("weights"), *effect = entry->find("effect");
      const auto* predictor = entry->find("predictor");
      if ((weights != nullptr) + (effect != nullptr) + (predictor != nullptr) != 1) {
        keys_.problem(entry,
                      fmt::format("contrast '{}' needs one of weights, an effect or a predictor.",
                                  plan.name));
      } else if (predictor) {
        if (!find_label(out_.trials.predictors, plan.predictor))
          keys_.problem(predictor,
                        fmt::format("contrast '{}' asks for predictor '{}', which is not one of "
                                    "regression.predictors.{}",
                                    plan.name, plan.predictor,
                                    did_you_mean(plan.predictor, out_.trials.predictors)));
      } else if (weights && weights->is_table()) {
        read_weights(*weights, plan);
      } else if (effect && effect->is_table()) {
        read_effect(*effect, plan);
      }
      for (const auto& other : out_.contrasts)
        if (file_label(other.name) == file_label(plan.name))
          keys_.problem(entry,
                        fmt::format("contrasts '{}' and '{}' would share their files: rename one.",
                                    other.name, plan.name));
      out_.contrasts.push_back(plan);
    }
    if (keys_.has("contrasts")) return;
    for (const auto& condition : out_.conditions)
      out_.contrasts.push_back({condition.name, {{condition.name, 1.0}}, ""});
    for (const auto& name : out_.trials.predictors) out_.contrasts.push_back({name, {}, name});
  }

  void read_weights(const TomlValue& weights, ContrastPlan& plan) {
    Labels names;
    for (const auto& condition : out_.conditions) names.push_back(condition.name);
    bool any = false;
    for (const auto& [name, value] : std::get<TomlValue::Table>(weights.value)) {
      if (!value.is_number()) return;
      if (!find_label(names, name))
        keys_.problem(&value,
                      fmt::format("contrast '{}' weights condition '{}', which is not one of "
                                  "[[conditions]].{}",
                                  plan.name, name, did_you_mean(name, names)));
      if (value.number() == 0) continue;
      any = true;
      plan.weights.push_back({name, value.number()});
    }
    if (!any) keys_.problem(&weights, fmt::format("contrast '{}' has no weight but 0.", plan.name));
  }

  void read_effect(const TomlValue& effect, ContrastPlan& plan) {
    std::vector<EffectFactor> factors;
    for (const auto& [factor, levels] : std::get<TomlValue::Table>(effect.value)) {
      if (!levels.is_array()) return;
      const auto& pair = std::get<TomlValue::Array>(levels.value);
      if (pair.size() != 2 || !pair[0].is_text() || !pair[1].is_text()) return;
      factors.push_back(
          {factor, std::get<std::string>(pair[0].value), std::get<std::string>(pair[1].value)});
    }
    try {
      plan.weights = effect_weights(out_.conditions, factors);
    } catch (const Error& error) {
      keys_.problem(&effect, fmt::format("contrast '{}': {}", plan.name, error.what()));
    }
  }

  void read_windows() {
    Labels contrasts;
    for (const auto& plan : out_.contrasts) contrasts.push_back(plan.name);
    for (const auto* entry : keys_.entries("windows")) {
      const auto *from = entry->find("from_ms"), *to = entry->find("to_ms");
      if (!from || !to || !from->is_number() || !to->is_number()) continue;
      TimeWindow window{text_of(*entry, "name"), from->number() * kMillisecond,
                        to->number() * kMillisecond, texts_of(*entry, "contrasts")};
      if (window.from_s > window.to_s)
        keys_.problem(entry, fmt::format("window '{}' ends before it begins.", window.name));
      for (const auto& name : window.contrasts)
        if (!find_label(contrasts, name))
          keys_.problem(entry, fmt::format("window '{}' names contrast '{}', which is not there.{}",
                                           window.name, name, did_you_mean(name, contrasts)));
      for (const auto& other : out_.windows)
        if (file_label(other.name) == file_label(window.name))
          keys_.problem(entry,
                        fmt::format("windows '{}' and '{}' would share their files: rename one.",
                                    other.name, window.name));
      out_.windows.push_back(window);
    }
    if (!keys_.has("windows"))
      keys_.problem(nullptr,
                    "no [[windows]]: name at least one latency window (name, from_ms, to_ms).");
  }

  void read_montage() {
    const std::string positions = keys_.text("montage.positions");
    if (positions != "standard") {
      out_.positions = absolute(positions).string();
      if (positions.find("{participant}") == std::string::npos && !fs::exists(out_.positions))
        keys_.problem(
            keys_.find("montage.positions"),
            fmt::format("'montage.positions': there is no file {} (\"standard\" takes the "
                        "10-5 names).",
                        out_.positions));
    }
    const std::string space = fold_case(keys_.text("montage.space"));
    out_.position_space = space == "mni"   ? CapSpace::mni
                          : space == "own" ? CapSpace::own
                                           : CapSpace::head;
    if (space == "own" && positions == "standard")
      keys_.problem(keys_.find("montage.space"),
                    "'montage.space' is \"own\", but the positions are standard: name a table in "
                    "montage.positions.");
    out_.edits.drop = keys_.texts("montage.drop");
    out_.edits.zero = keys_.texts("montage.zero");
    if (const auto* rename = keys_.find("montage.rename"); rename && rename->is_table())
      for (const auto& [from, to] : std::get<TomlValue::Table>(rename->value))
        if (to.is_text()) out_.edits.rename[from] = std::get<std::string>(to.value);
  }

  void read_head() {
    const auto* radius = keys_.find("head.radius_mm");
    out_.fit_radius = radius && radius->is_text();
    if (out_.fit_radius && out_.positions == "standard")
      keys_.problem(radius,
                    "'head.radius_mm' is \"fit\", but standard positions have no measured "
                    "radius: give a number or a table of positions.");
    const double scalp_m = (out_.fit_radius ? 92 : keys_.number("head.radius_mm")) * kMillimetre;
    const auto shells = keys_.numbers("head.shells");
    const auto sigma = keys_.numbers("head.conductivity_S_per_m");
    out_.head.radii_m.resize(static_cast<Eigen::Index>(shells.size()));
    out_.head.conductivity_S_per_m.resize(static_cast<Eigen::Index>(sigma.size()));
    std::copy(shells.begin(), shells.end(), out_.head.radii_m.data());
    std::copy(sigma.begin(), sigma.end(), out_.head.conductivity_S_per_m.data());
    out_.head.radii_m *= scalp_m;
    if (!shells.empty() && std::abs(shells.back() - 1) > 1e-12)
      keys_.problem(keys_.find("head.shells"), "'head.shells' must end with 1, the scalp itself.");
    try {
      check_head(out_.head);
      if (out_.head.radii_m.size() > 0 && !keys_.has("grid.points") && shells[0] < 0.83)
        keys_.problem(
            keys_.find("head.shells"),
            fmt::format("the innermost shell ends at {:g} of the scalp's radius, but the template "
                        "brain reaches 0.83: sources would lie in the skull.",
                        shells[0]));
    } catch (const Error& error) {
      keys_.problem(keys_.find("head.shells"), error.what());
    }
  }

  void read_grid() {
    out_.spacing_m = keys_.number("grid.spacing_mm") * kMillimetre;
    out_.points_table = optional_path("grid.points");
    out_.point_space =
        fold_case(keys_.text("grid.space")) == "head" ? PointSpace::head : PointSpace::mni;
    out_.atlas = optional_path("grid.atlas");
    out_.atlas_table = optional_path("grid.atlas_table");
    if (out_.atlas.has_value() != out_.atlas_table.has_value())
      keys_.problem(keys_.find(out_.atlas ? "grid.atlas" : "grid.atlas_table"),
                    "'grid.atlas' and 'grid.atlas_table' go together.");
  }

  void read_noise() {
    const std::string from = fold_case(keys_.text("noise.from"));
    out_.noise.oas =
        keys_.has("noise.shrinkage") && fold_case(keys_.text("noise.shrinkage")) == "oas";
    if (from == "trials" || (out_.has_trials() && !keys_.has("noise.from"))) {
      out_.noise.from = NoiseOptions::From::trials;
      if (!out_.has_trials())
        keys_.problem(keys_.find("noise.from"),
                      "'noise.from' is \"trials\", but there are none: give "
                      "[trials] with recordings.");
    } else if (from == "residual") {
      out_.noise.from = NoiseOptions::From::residual;
      if (!keys_.has("noise.after_ms"))
        keys_.problem(keys_.find("noise.from"),
                      "'noise.after_ms' is missing: the latency from which what "
                      "is left counts as noise.");
      out_.noise.after_s = keys_.number("noise.after_ms") * kMillisecond;
    } else if (from == "table") {
      out_.noise.from = NoiseOptions::From::table;
      if (const auto table = optional_path("noise.table"))
        out_.noise.table = *table;
      else
        keys_.problem(keys_.find("noise.from"),
                      "'noise.table' is missing: the covariance to read.");
    }
    if (const auto window = keys_.numbers("noise.baseline_ms"); window.size() == 2) {
      out_.noise.baseline_from_s = window[0] * kMillisecond;
      out_.noise.baseline_to_s = window[1] * kMillisecond;
      if (window[0] >= window[1])
        keys_.problem(keys_.find("noise.baseline_ms"),
                      "'noise.baseline_ms' must begin before it ends.");
    } else if (keys_.has("noise.baseline_ms")) {
      keys_.problem(keys_.find("noise.baseline_ms"), "'noise.baseline_ms' needs two numbers.");
    }
    out_.noise.whole_epoch = !keys_.has("noise.baseline_ms");
    if (const auto* shrinkage = keys_.find("noise.shrinkage"); shrinkage && shrinkage->is_number())
      out_.noise.shrinkage = shrinkage->number();
  }

  void read_inverse() {
    for (const auto& method : keys_.texts("inverse.methods"))
      out_.methods.push_back(fold_case(method));
    for (const auto& repeated : repeated_labels(out_.methods))
      keys_.problem(keys_.find("inverse.methods"),
                    fmt::format("method '{}' is there twice.", repeated));
    if (out_.methods.empty())
      keys_.problem(keys_.find("inverse.methods"),
                    "'inverse.methods' is empty: name at least one.");
    out_.depth_exponent = keys_.number("inverse.depth_exponent");
    using Kind = RegularisationRule::Kind;
    if (fold_case(keys_.text("inverse.regularisation")) == "l-curve")
      out_.regularisation.kind = Kind::l_curve;
    if (const auto* rule = keys_.find("inverse.regularisation"); rule && rule->is_table()) {
      const auto& members = std::get<TomlValue::Table>(rule->value);
      if (members.size() == 1 && members[0].second.is_number())
        out_.regularisation = {members[0].first == "snr" ? Kind::snr : Kind::lambda,
                               members[0].second.number()};
    }
    out_.lcmv_from_s = keys_.number("lcmv.from_ms") * kMillisecond;
    if (keys_.has("lcmv.to_ms")) out_.lcmv_to_s = keys_.number("lcmv.to_ms") * kMillisecond;
    if (out_.lcmv_from_s >= out_.lcmv_to_s)
      keys_.problem(keys_.find(keys_.has("lcmv.to_ms") ? "lcmv.to_ms" : "lcmv.from_ms"),
                    "'lcmv.to_ms' must lie after 'lcmv.from_ms'.");
    const std::string data_from = fold_case(keys_.text("lcmv.from"));
    out_.lcmv_from_trials = out_.has_trials() && data_from != "averages";
    if (data_from == "trials" && !out_.has_trials())
      keys_.problem(keys_.find("lcmv.from"),
                    "'lcmv.from' is \"trials\", but there are none: give "
                    "[trials] with recordings.");
    out_.lcmv_table = optional_path("lcmv.table");
    out_.lcmv.regularisation = keys_.number("lcmv.regularisation");
    out_.lcmv.mirror_paired = keys_.flag("lcmv.mirror_paired");
    const std::string output = fold_case(keys_.text("lcmv.output"));
    out_.lcmv.output = output == "unit-gain"        ? LcmvOptions::Output::unit_gain
                       : output == "activity-index" ? LcmvOptions::Output::activity_index
                                                    : LcmvOptions::Output::unit_noise_gain;
    out_.lcmv.orientation = fold_case(keys_.text("lcmv.orientation")) == "vector"
                                ? LcmvOptions::Orientation::vector
                                : LcmvOptions::Orientation::maximum_power;
  }

  void read_regions() {
    for (const auto* entry : keys_.entries("regions")) {
      RegionRequest request{text_of(*entry, "name"), texts_of(*entry, "gyri"),
                            text_of(*entry, "lobe"), fold_case(text_of(*entry, "side"))};
      if (request.gyri.empty() == request.lobe.empty())
        keys_.problem(entry, fmt::format("region '{}' needs either gyri or a lobe.", request.name));
      else
        check_region(*entry, request);
      for (const auto& other : out_.regions)
        if (file_label(other.name) == file_label(request.name))
          keys_.problem(entry,
                        fmt::format("regions '{}' and '{}' would share their columns: rename one.",
                                    other.name, request.name));
      out_.regions.push_back(request);
    }
  }

  /// Are there such gyri or such a lobe? Of an atlas only its reading can tell.
  void check_region(const TomlValue& entry, const RegionRequest& request) {
    if (out_.atlas || out_.points_table) return;
    const bool usable = out_.spacing_m >= 4e-3 && out_.spacing_m <= 12e-3;
    if (lattice_labels_.gyri.empty())
      lattice_labels_ =
          template_labels(lattice_grid(usable ? out_.spacing_m : 7e-3, 92 * kMillimetre));
    try {
      RegionRequest known_side = request;  // another side has been reported with the key
      if (known_side.side != "left" && known_side.side != "right") known_side.side.clear();
      requested_regions(lattice_labels_, {known_side});
    } catch (const Error& error) {
      keys_.problem(&entry, error.what());
    }
  }

  KeyReader& keys_;
  Experiment& out_;
  fs::path folder_;
  PointLabels lattice_labels_;  ///< of the template's gyri, made when regions are asked for
};

}  // namespace

Experiment read_experiment(const std::filesystem::path& file) {
  const TomlValue root = read_toml(file);
  KeyReader keys(root, file.string());
  Experiment experiment;
  experiment.file = file;
  Assembly(keys, experiment).run();
  if (!keys.problems().empty()) {
    std::string all = fmt::format("{} {} in the experiment file:", keys.problems().size(),
                                  keys.problems().size() == 1 ? "problem" : "problems");
    for (const auto& problem : keys.problems()) all += "\n  " + problem;
    throw ExperimentError(all);
  }
  return experiment;
}

std::filesystem::path fill_pattern(const std::string& pattern, const std::string& participant,
                                   const std::string& condition) {
  return replace_all(replace_all(pattern, "{participant}", participant), "{condition}", condition);
}

std::string general_text(const std::string& text, const std::string& participant) {
  return replace_all(text, participant, "{participant}");
}

std::vector<TimeWindow> windows_of(const Experiment& experiment, const std::string& contrast) {
  std::vector<TimeWindow> windows;
  for (const auto& window : experiment.windows)
    if (window.contrasts.empty() || find_label(window.contrasts, contrast))
      windows.push_back(window);
  return windows;
}

}  // namespace headwater
