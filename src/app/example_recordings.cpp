// SPDX-License-Identifier: GPL-3.0-or-later
#include "example_recordings.hpp"

#include "example_noise.hpp"

#include <headwater/base/edf_writing.hpp>
#include <headwater/base/json.hpp>
#include <headwater/base/parallel.hpp>
#include <headwater/base/random.hpp>
#include <headwater/base/table.hpp>
#include <headwater/base/units.hpp>
#include <headwater/base/version.hpp>
#include <headwater/signal/reference.hpp>
#include <headwater/signal/regressors.hpp>

#include <Eigen/Geometry>
#include <fmt/core.h>

#include <cmath>

namespace headwater {
namespace {

namespace fs = std::filesystem;

constexpr double kLead_s = 2;  // of silence before the first beat and after the last

/// The beats of one person: rows of _events.tsv.
struct Pattern {
  std::vector<double> onset_s, interval_ms;
  std::vector<int> block;
  std::vector<bool> late;
  Eigen::VectorXd surprise;  // bit, of each beat
  double duration_s = 0;
};

OutputTable events_table(const Pattern& pattern) {
  OutputTable table{"Beats of the pattern. Invented.",
                    {{"onset", "Time of the beat in the recording", "s"},
                     {"duration", "Length of the sound", "s"},
                     {"trial_type", "steady or late", ""},
                     {"interval_ms", "Interval before the beat", "ms"},
                     {"block", "Block of the pattern", ""}},
                    {}};
  for (std::size_t i = 0; i < pattern.onset_s.size(); ++i)
    table.rows.push_back(
        {format_fixed(pattern.onset_s[i], 3), "0.05", pattern.late[i] ? "late" : "steady",
         format_fixed(pattern.interval_ms[i], 0), std::to_string(pattern.block[i])});
  return table;
}

/// What an ideal observer feels, with the very columns that users have.
Eigen::VectorXd surprise_of(const Pattern& pattern, double forgetting) {
  const OutputTable written = events_table(pattern);
  Table events;
  events.source = "example events";
  for (const auto& column : written.columns) events.columns.push_back(column.name);
  events.rows = written.rows;
  for (std::size_t i = 0; i < events.rows.size(); ++i)
    events.lines.push_back(static_cast<int>(i) + 2);
  ObserverOptions options;
  options.value_column = "interval_ms";
  options.block_columns = {"block"};
  options.forgetting = forgetting;
  return observe(events, options).surprise;
}

Pattern draw_pattern(const ExampleRecordings& recipe, double rate_Hz, RandomStream stream) {
  Pattern pattern;
  double now = kLead_s;
  for (int block = 0; block < recipe.blocks; ++block)
    for (int beat = 0; beat < recipe.beats; ++beat) {
      const double sd = block % 2 == 0 ? recipe.steady_sd_s : recipe.loose_sd_s;
      const bool late = stream.uniform() < recipe.late_share;
      double interval = recipe.interval_s + sd * stream.normal() + (late ? recipe.late_s : 0);
      interval = std::round(interval * rate_Hz) / rate_Hz;  // beats fall on samples
      now += interval;
      pattern.onset_s.push_back(now);
      pattern.interval_ms.push_back(interval / kMillisecond);
      pattern.block.push_back(block + 1);
      pattern.late.push_back(late);
    }
  pattern.duration_s = std::ceil(now + kLead_s);  // whole records of a second
  pattern.surprise = surprise_of(pattern, recipe.forgetting);
  return pattern;
}

/// Background of any length: two-second stretches, each faded into the next over half of it.
Eigen::MatrixXd long_background(const ExampleRecipe& recipe, const BackgroundMaps& maps,
                                const ExamplePerson& person, Eigen::Index samples, double rate_Hz,
                                RandomStream stream) {
  const auto length = static_cast<Eigen::Index>(2 * rate_Hz), half = length / 2;
  const Eigen::VectorXd times =
      Eigen::VectorXd::LinSpaced(length, 0, static_cast<double>(length - 1) / rate_Hz);
  const BackgroundSpectra spectra = background_spectra(recipe.background, times);
  // sin^2 + cos^2 = 1: the power of two independent stretches adds up to that of one.
  const Eigen::RowVectorXd fade =
      ((Eigen::ArrayXd::LinSpaced(length, 0, static_cast<double>(length - 1)) + 0.5) * kPi /
       static_cast<double>(length))
          .sin()
          .matrix()
          .transpose();
  Eigen::MatrixXd background =
      Eigen::MatrixXd::Zero(person.electrodes.cols(), samples + 2 * length);
  for (Eigen::Index at = 0; at + length <= background.cols(); at += half) {
    Eigen::MatrixXd stretch =
        (maps.broad * stream.normal_matrix(maps.broad.cols(), spectra.broad.rows())) *
        spectra.broad;
    stretch += (maps.alpha * stream.normal_matrix(maps.alpha.cols(), spectra.alpha.rows())) *
               spectra.alpha;
    background.middleCols(at, length) += stretch * fade.asDiagonal();
  }
  Eigen::MatrixXd result = background.middleCols(length, samples);
  result += recipe.background.sensor_V * stream.normal_matrix(result.rows(), samples);
  return result;
}

const ExampleComponent* component_of(const ExampleRecipe& recipe, const std::string& source) {
  for (const auto& component : recipe.components)
    for (const auto& planted : component.sources)
      if (planted.name == source) return &component;
  return nullptr;
}

double share_of(const ExampleComponent& component, const std::string& source) {
  for (const auto& planted : component.sources)
    if (planted.name == source) return planted.share;
  return 0;
}

/// Strength of a component at a beat, before shares and the person's factor, A m.
double strength_at(const ExampleRecordings& recipe, const std::string& component, double surprise,
                   double mean_surprise) {
  if (component == "N1") return recipe.n1_Am;
  if (component == "mismatch")
    return recipe.mismatch_Am + recipe.mismatch_per_bit_Am * (surprise - mean_surprise);
  return 0;
}

/// Adds what the sources give at every beat.
void add_responses(const ExampleRecipe& recipe, const ExamplePerson& person, const Pattern& pattern,
                   double rate_Hz, Eigen::MatrixXd& potentials_V) {
  ExamplePerson unit = person;  // each source with a moment of 1 A m in one condition of its own
  const double mean_surprise = pattern.surprise.mean();
  const auto& times = recipe.times_s;
  for (const auto& source : person.sources) {
    const auto* component = component_of(recipe, source.name);
    unit.sources = {source};
    unit.sources[0].moment_Am = {1.0};
    const Eigen::MatrixXd response = response_of(unit, 0, times);
    for (std::size_t i = 0; i < pattern.onset_s.size(); ++i) {
      const double strength =
          strength_at(recipe.recordings, component->name,
                      pattern.surprise[static_cast<Eigen::Index>(i)], mean_surprise) *
          share_of(*component, source.name) * source.factor;
      if (strength == 0) continue;
      const auto first =
          static_cast<Eigen::Index>(std::lround((pattern.onset_s[i] + times[0]) * rate_Hz));
      potentials_V.middleCols(first, times.size()) += strength * response;
    }
  }
}

OutputTable channels_table(const ExampleRecipe& recipe) {
  OutputTable table{"Channels of the recording.",
                    {{"name", "Lead", ""},
                     {"type", "BIDS channel type", ""},
                     {"units", "Unit of the recording", ""},
                     {"status", "good or bad", ""}},
                    {}};
  for (const auto& lead : recipe.leads) table.rows.push_back({lead, "EEG", "uV", "good"});
  return table;
}

/// The electrodes as a digitiser between the ears would see them: tilted, and about another origin.
OutputTable electrodes_table(const ExamplePerson& person) {
  OutputTable table{"Digitised electrodes, in the digitiser's own frame.",
                    {{"name", "Lead", ""}, {"x", "", "m"}, {"y", "", "m"}, {"z", "", "m"}},
                    {}};
  const Eigen::Vector3d origin(0.002, -0.018, -0.041);
  const Eigen::Matrix3d turn =
      Eigen::AngleAxisd(9 * kPi / 180, Eigen::Vector3d::UnitX()).toRotationMatrix();
  for (Eigen::Index m = 0; m < person.electrodes.cols(); ++m) {
    const Eigen::Vector3d at = turn * (person.electrodes.col(m) - origin);
    table.rows.push_back({person.channels[static_cast<std::size_t>(m)], format_fixed(at.x(), 5),
                          format_fixed(at.y(), 5), format_fixed(at.z(), 5)});
  }
  return table;
}

void write_side_files(const fs::path& stem, const ExampleRecipe& recipe,
                      const ExamplePerson& person, const Pattern& pattern, double rate_Hz) {
  const auto beside = [&](const char* suffix) { return fs::path(stem.string() + suffix); };
  write_table(beside("_events.tsv"), events_table(pattern));
  write_table(beside("_channels.tsv"), channels_table(recipe));
  write_table(beside("_electrodes.tsv"), electrodes_table(person));
  Json recording = Json::object();
  recording.set("TaskName", "pattern")
      .set("EEGReference", recipe.reference)
      .set("SamplingFrequency", rate_Hz)
      .set("PowerLineFrequency", 50)
      .set("SoftwareFilters", "n/a")
      .set("RecordingType", "continuous");
  write_json(beside("_eeg.json"), recording);
  Json frame = Json::object();
  frame.set("EEGCoordinateSystem", "Other")
      .set("EEGCoordinateSystemDescription", "Frame of the digitiser: invented, tilted, origin low")
      .set("EEGCoordinateUnits", "m");
  write_json(beside("_coordsystem.json"), frame);
}

void write_recording(const fs::path& folder, const ExampleRecipe& recipe,
                     const ExamplePerson& person, const Pattern& pattern, bool spoil,
                     std::uint64_t seed) {
  const double rate = std::round(1 / (recipe.times_s[1] - recipe.times_s[0]));
  const double radius = default_head().radii_m.tail(1)[0];
  const SourceGrid lattice = lattice_grid(recipe.background.lattice_m, radius);
  const BackgroundMaps maps = background_maps(recipe.background, lattice, radius, person, seed);
  const auto samples = static_cast<Eigen::Index>(std::lround(pattern.duration_s * rate));
  Eigen::MatrixXd potentials =
      long_background(recipe, maps, person, samples, rate,
                      RandomStream(seed, fmt::format("example {} recording", person.name)));
  add_responses(recipe, person, pattern, rate, potentials);
  Eigen::MatrixXd data = (channel_reference(person.channels, {recipe.reference}) * potentials)
                             .topRows(static_cast<Eigen::Index>(recipe.leads.size()));
  if (spoil) {
    RandomStream stream(seed, fmt::format("example {} bad lead", person.name));
    data.row(*find_label(recipe.leads, recipe.recordings.bad_lead)) +=
        recipe.recordings.bad_V * stream.normal_matrix(1, samples);
  }
  const fs::path stem = folder / person.name / "eeg" / (person.name + "_task-pattern");
  fs::create_directories(stem.parent_path());
  write_edf(stem.string() + "_eeg.edf", recipe.leads, static_cast<int>(rate), data / kMicrovolt,
            {});
  write_side_files(stem, recipe, person, pattern, rate);
}

void write_truth(const fs::path& path, const ExampleRecipe& recipe,
                 const std::vector<ExamplePerson>& people, const std::vector<Pattern>& patterns) {
  OutputTable table{
      "What was planted in the recordings: how the mismatch grows with surprise. Places: "
      "truth_participants.tsv.",
      {{"participant_id", "Participant", ""},
       {"surprise_mean", "Mean surprise of the beats", "bit"},
       {"surprise_sd", "Its standard deviation", "bit"},
       {"left_nAm_per_sd", "Growth of the left mismatch source for each standard deviation",
        "nA m"},
       {"right_nAm_per_sd", "Growth of the right one", "nA m"}},
      {}};
  for (std::size_t p = 0; p < patterns.size(); ++p) {
    const Eigen::VectorXd& surprise = patterns[p].surprise;
    const double mean = surprise.mean();
    const double sd = std::sqrt((surprise.array() - mean).square().sum() /
                                static_cast<double>(surprise.size() - 1));
    std::vector<std::string> row{people[p].name, format_fixed(mean, 3), format_fixed(sd, 3)};
    for (const char* name : {"mismatch left", "mismatch right"})
      for (const auto& source : people[p].sources)
        if (source.name == name)
          row.push_back(format_fixed(recipe.recordings.mismatch_per_bit_Am * sd * source.factor *
                                         share_of(*component_of(recipe, name), name) /
                                         kNanoampereMetre,
                                     2));
    table.rows.push_back(std::move(row));
  }
  write_table(path, table);
}

}  // namespace

void write_example_recordings(const fs::path& folder, const ExampleRecipe& recipe,
                              const std::vector<ExamplePerson>& people, std::uint64_t seed) {
  const double rate = std::round(1 / (recipe.times_s[1] - recipe.times_s[0]));
  std::vector<Pattern> patterns;
  for (int p = 0; p < recipe.recordings.people; ++p)
    patterns.push_back(draw_pattern(
        recipe.recordings, rate,
        RandomStream(seed,
                     fmt::format("example {} pattern", people[static_cast<std::size_t>(p)].name))));
  const fs::path bids = folder / "recordings";
  OutputTable list{"Participants of the recordings. Invented.", {{"participant_id", "", ""}}, {}};
  for (std::size_t p = 0; p < patterns.size(); ++p) list.rows.push_back({people[p].name});
  write_table(bids / "participants.tsv", list);
  Json description = Json::object();
  description.set("Name", "A drum pattern with late beats, aid off (invented)")
      .set("BIDSVersion", "1.8.0")
      .set("DatasetType", "raw");
  write_json(bids / "dataset_description.json", description);
  parallel_for(patterns.size(), 0, [&](std::size_t p) {
    const bool spoil = static_cast<int>(p) + 1 == recipe.recordings.bad_person;
    write_recording(bids, recipe, people[p], patterns[p], spoil, seed);
  });
  write_truth(folder / "truth_recordings.tsv", recipe, people, patterns);
}

}  // namespace headwater
