// SPDX-License-Identifier: GPL-3.0-or-later
#include "example_noise.hpp"
#include "example_person.hpp"
#include "example_recipe.hpp"
#include "example_recordings.hpp"

#include <headwater/app/example.hpp>
#include <headwater/base/atomic_file.hpp>
#include <headwater/base/embedded_file.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/json.hpp>
#include <headwater/base/parallel.hpp>
#include <headwater/base/table.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/reference.hpp>
#include <headwater/signal/time_window.hpp>

#include <fmt/core.h>
#include <fmt/ranges.h>

#include <system_error>

namespace headwater {
namespace {

namespace fs = std::filesystem;

constexpr int kVoltageDecimals = 4;  // of uV
constexpr const char* kParticipantColumn = "The participant, as in participants.tsv.";

void refuse_used_folder(const fs::path& folder) {
  std::error_code failure;
  if (!fs::exists(folder, failure)) return;
  if (!fs::is_directory(folder, failure))
    throw ExperimentError(
        fmt::format("{} is a file: the example needs a folder of its own. Give "
                    "the name of a new folder.",
                    folder.string()));
  const bool empty = fs::is_empty(folder, failure);
  if (failure)
    throw ResourceError(
        fmt::format("{} cannot be looked into: {}.", folder.string(), failure.message()));
  if (!empty)
    throw ExperimentError(
        fmt::format("{} is not empty: the example would mix with what is there. "
                    "Give the name of a new folder.",
                    folder.string()));
}

/// As recorded: leads against the reference, #leads by #times, V, baseline corrected.
Eigen::MatrixXd recorded(const ExampleRecipe& recipe, const ExamplePerson& person,
                         const Eigen::MatrixXd& potentials_V) {
  Eigen::MatrixXd data = (channel_reference(person.channels, {recipe.reference}) * potentials_V)
                             .topRows(static_cast<Eigen::Index>(recipe.leads.size()));
  const SampleRange before = samples_in(recipe.times_s, {"baseline", recipe.times_s[0], 0, {}});
  const Eigen::VectorXd baseline = data.middleCols(before.first, before.count).rowwise().mean();
  return data.colwise() - baseline;
}

std::string average_text(const ExampleRecipe& recipe, const Eigen::MatrixXd& data_V) {
  std::string text = "time_s";
  for (const auto& lead : recipe.leads) text += '\t' + lead;
  for (Eigen::Index t = 0; t < data_V.cols(); ++t) {
    text += '\n' + format_fixed(recipe.times_s[t], 3);
    for (Eigen::Index m = 0; m < data_V.rows(); ++m)
      text += '\t' + format_fixed(data_V(m, t) / kMicrovolt, kVoltageDecimals);
  }
  return text + '\n';
}

void write_averages(const fs::path& folder, const ExampleRecipe& recipe,
                    const std::vector<ExamplePerson>& people, std::uint64_t seed) {
  const double radius = default_head().radii_m.tail(1)[0];
  const SourceGrid lattice = lattice_grid(recipe.background.lattice_m, radius);
  const BackgroundSpectra spectra = background_spectra(recipe.background, recipe.times_s);
  parallel_for(people.size(), 0, [&](std::size_t p) {
    const ExamplePerson& person = people[p];
    const BackgroundMaps maps = background_maps(recipe.background, lattice, radius, person, seed);
    for (std::size_t k = 0; k < recipe.conditions.size(); ++k) {
      const Eigen::MatrixXd potentials = response_of(person, k, recipe.times_s) +
                                         draw_background(recipe, spectra, maps, person, k, seed);
      write_file(folder / fmt::format("{}_{}.tsv", person.name, recipe.conditions[k].name),
                 average_text(recipe, recorded(recipe, person, potentials)));
    }
  });
}

void write_average_columns(const fs::path& path, const ExampleRecipe& recipe) {
  const auto entry = [](const std::string& description, const char* unit) {
    return Json::object().set("Description", description).set("Units", unit);
  };
  Json columns = Json::object();
  columns.set("Description",
              "Columns of every <participant>_<condition>.tsv in this folder: the average of a "
              "condition's trials.");
  columns.set("time_s", entry("Time after the beat.", "s"));
  for (const auto& lead : recipe.leads)
    columns.set(lead,
                entry(fmt::format("Voltage at {} against {}.", lead, recipe.reference), "uV"));
  write_json(path, columns);
}

void write_trials(const fs::path& path, const ExampleRecipe& recipe,
                  const std::vector<ExamplePerson>& people) {
  OutputTable table{"Trials in each average.",
                    {{"participant_id", kParticipantColumn, ""},
                     {"condition", "The condition, as in experiment.toml.", ""},
                     {"trials", "Number of trials averaged.", ""}},
                    {}};
  for (const auto& person : people)
    for (std::size_t k = 0; k < recipe.conditions.size(); ++k)
      table.rows.push_back(
          {person.name, recipe.conditions[k].name, fmt::format("{}", person.trials[k])});
  write_table(path, table);
}

void write_participants(const fs::path& path, const std::vector<ExamplePerson>& people) {
  OutputTable table{
      "Participants. Invented: nobody was recorded.",
      {{"participant_id", "Name of the participant.", ""},
       {"age", "Age, drawn at random.", "year"},
       {"hearing_loss_dB", "Mean hearing loss of the better ear, drawn at random.", "dB"}},
      {}};
  for (const auto& person : people)
    table.rows.push_back({person.name, fmt::format("{}", person.age_years),
                          fmt::format("{}", person.hearing_loss_dB)});
  write_table(path, table);
}

void append_place_columns(std::vector<ColumnInfo>& columns) {
  for (const char axis : {'x', 'y', 'z'})
    columns.push_back({fmt::format("{}_mm", axis), "Place in MNI space.", "mm"});
}

void append_place(std::vector<std::string>& row, const Eigen::Vector3d& mni_m) {
  for (int axis = 0; axis < 3; ++axis) row.push_back(format_fixed(mni_m[axis] / kMillimetre, 1));
}

void write_truth(const fs::path& path, const ExampleRecipe& recipe) {
  OutputTable table{
      "The planted sources, before people differ.", {{"name", "Name of the source.", ""}}, {}};
  append_place_columns(table.columns);
  for (const char axis : {'x', 'y', 'z'})
    table.columns.push_back({fmt::format("direction_{}", axis),
                             "Direction of the current (unit vector; right, front, top).", ""});
  for (const auto& condition : recipe.conditions)
    table.columns.push_back({condition.name + "_nAm",
                             "Strength at the peak in this condition, along the direction.",
                             "nA m"});
  table.columns.push_back({"latency_ms", "Time of the peak after the beat.", "ms"});
  table.columns.push_back({"width_ms", "Standard deviation of the Gaussian time course.", "ms"});
  table.columns.push_back(
      {"contrasts", "Contrasts of experiment.toml that show it, separated by commas.", ""});
  for (const auto& component : recipe.components)
    for (const auto& source : component.sources) {
      std::vector<std::string> row{source.name};
      append_place(row, source.mni_m);
      for (int axis = 0; axis < 3; ++axis) row.push_back(format_fixed(source.direction[axis], 4));
      for (const double moment : component.moment_Am)
        row.push_back(format_fixed(moment * source.share / kNanoampereMetre, 2));
      row.push_back(format_fixed(component.latency_s / kMillisecond, 0));
      row.push_back(format_fixed(component.width_s / kMillisecond, 0));
      row.push_back(fmt::format("{}", fmt::join(component.shows_in, ", ")));
      table.rows.push_back(std::move(row));
    }
  write_table(path, table);
}

void write_truth_of_people(const fs::path& path, const std::vector<ExamplePerson>& people) {
  OutputTable table{
      "The planted sources of each participant. Direction and width: truth.tsv.",
      {{"participant_id", kParticipantColumn, ""}, {"name", "The source, as in truth.tsv.", ""}},
      {}};
  append_place_columns(table.columns);
  table.columns.push_back({"strength", "Factor on the strengths of truth.tsv.", ""});
  table.columns.push_back({"latency_ms", "Time of the peak after the beat.", "ms"});
  for (const auto& person : people)
    for (const auto& source : person.sources) {
      std::vector<std::string> row{person.name, source.name};
      append_place(row, source.mni_m);
      row.push_back(format_fixed(source.factor, 3));
      row.push_back(format_fixed(source.latency_s / kMillisecond, 1));
      table.rows.push_back(std::move(row));
    }
  write_table(path, table);
}

void write_truth_of_heads(const fs::path& path, const std::vector<ExamplePerson>& people) {
  OutputTable table{"What each participant's averages were computed with.",
                    {{"participant_id", kParticipantColumn, ""},
                     {"radius_mm", "Radius of the scalp.", "mm"},
                     {"skull_ratio", "Conductivity of the brain over that of the skull.", ""},
                     {"background_uV",
                      "Root mean square of a single trial's background, average reference, before "
                      "baseline correction and without the sensors' noise.",
                      "uV"}},
                    {}};
  for (const auto& person : people)
    table.rows.push_back({person.name, format_fixed(person.head_radius_m() / kMillimetre, 1),
                          format_fixed(person.skull_ratio, 1),
                          format_fixed(person.background_rms_V / kMicrovolt, 1)});
  write_table(path, table);
}

}  // namespace

void write_example(const fs::path& folder, std::uint64_t seed) {
  refuse_used_folder(folder);
  const ExampleRecipe recipe = read_example_recipe();
  std::vector<ExamplePerson> people;
  for (int number = 1; number <= recipe.people.count; ++number)
    people.push_back(draw_person(recipe, seed, number));

  write_averages(folder / "averages", recipe, people, seed);
  write_average_columns(folder / "averages" / "averages.json", recipe);
  write_trials(folder / "averages" / "trials.tsv", recipe, people);
  write_participants(folder / "participants.tsv", people);
  write_truth(folder / "truth.tsv", recipe);
  write_truth_of_people(folder / "truth_participants.tsv", people);
  write_truth_of_heads(folder / "truth_heads.tsv", people);
  write_example_recordings(folder, recipe, people, seed);
  write_file(folder / "README.md", embedded_file("example_readme.md"));
  write_file(folder / "recordings.toml", embedded_file("example_recordings.toml"));
  // Last: where the experiment file is, everything is.
  write_file(folder / "experiment.toml", embedded_file("example_experiment.toml"));
}

}  // namespace headwater
