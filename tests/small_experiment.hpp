// SPDX-License-Identifier: GPL-3.0-or-later
// A complete experiment of three invented people, small enough to be run in a moment: 32 leads, two
// conditions, one dipole in the right temporal lobe that acts in one of them, white noise.
#pragma once
#include "base_scratch.hpp"
#include "program.hpp"

#include <headwater/base/random.hpp>
#include <headwater/base/table.hpp>
#include <headwater/base/units.hpp>
#include <headwater/model/lead_field.hpp>
#include <headwater/model/mni_map.hpp>
#include <headwater/signal/electrodes.hpp>

#include <cmath>
#include <fstream>
#include <sstream>

namespace headwater {

inline const char* const kSmallExperiment = R"(title = "Small"
output = "results"
[averages]
file = "averages/{participant}_{condition}.tsv"
counts = "trials.tsv"
[montage]
positions = "standard"
[[conditions]]
name = "late"
beat = "odd"
[[conditions]]
name = "steady"
beat = "even"
[[contrasts]]
name = "late minus steady"
weights = { late = 1, steady = -1 }
[[windows]]
name = "mismatch"
from_ms = 80
to_ms = 120
[grid]
spacing_mm = 12
[inverse]
methods = ["sloreta"]
regularisation = "gcv"
)";

struct SmallExperiment {
  Scratch scratch;
  std::filesystem::path folder = scratch.folder / "experiment";
  Labels leads{"Fp1", "Fp2", "AF3", "AF4", "F7", "F3",  "Fz",  "F4",  "F8",  "FC5", "FC1",
               "FC2", "FC6", "T7",  "C3",  "Cz", "C4",  "T8",  "CP5", "CP1", "CP2", "CP6",
               "P7",  "P3",  "Pz",  "P4",  "P8", "PO3", "PO4", "O1",  "Oz",  "O2"};
  Labels people{"sub-01", "sub-02", "sub-03"};
  static constexpr Eigen::Index kSamples = 76;

  SmallExperiment() {
    const double radius = 92 * kMillimetre;
    const Montage montage = standard_montage(leads, radius);
    const Eigen::Vector3d place = mni_to_head(Eigen::Vector3d(52, -20, 8) * kMillimetre, radius);
    const Eigen::VectorXd map = compute_gain(default_head(), montage.positions, place) *
                                Eigen::Vector3d(0.1, -0.55, -0.83) * 30 * kNanoampereMetre;
    std::string counts = "participant_id\tcondition\ttrials\n";
    for (const auto& person : people)
      for (const char* condition : {"late", "steady"}) {
        RandomStream random(1, person + condition);
        Eigen::MatrixXd table(kSamples, 1 + static_cast<Eigen::Index>(leads.size()));
        for (Eigen::Index t = 0; t < kSamples; ++t) {
          const double time = -0.1 + 0.004 * static_cast<double>(t);
          const double course =
              condition[0] == 'l' ? std::exp(-0.5 * std::pow((time - 0.1) / 0.02, 2)) : 0;
          table(t, 0) = time;
          table.row(t).tail(map.size()) =
              (map.transpose() * course / kMicrovolt) + 0.3 * random.normal_matrix(1, map.size());
        }
        write_average(person, condition, table);
        counts += person + "\t" + condition + "\t100\n";
      }
    write("trials.tsv", counts);
    write("experiment.toml", kSmallExperiment);
  }

  std::filesystem::path average(const std::string& person, const std::string& condition) const {
    return folder / "averages" / (person + "_" + condition + ".tsv");
  }
  void write(const std::string& name, const std::string& text) const {
    write_file(folder / name, text);
  }
  void write_average(const std::string& person, const std::string& condition,
                     const Eigen::MatrixXd& table) const {
    Labels columns{"time_s"};
    columns.insert(columns.end(), leads.begin(), leads.end());
    write_file(average(person, condition), number_table_text(columns, {}, table, 9));
  }
  /// Rewrites both averages of a person (of all, where no name is given).
  template <typename Change>
  void change_averages(const Change& change, const std::string& only = "") const {
    for (const auto& person : people)
      for (const char* condition : {"late", "steady"}) {
        if (!only.empty() && person != only) continue;
        const auto path = average(person, condition);
        write_file(path, change(read_file(path, "average")));
      }
  }
  /// Rewrites the numbers of the averages: every column but the time.
  template <typename Change>
  void change_numbers(const Change& change, const std::string& only = "") const {
    for (const auto& person : people)
      for (const char* condition : {"late", "steady"}) {
        if (!only.empty() && person != only) continue;
        NumberTable table = read_number_table(average(person, condition), "average");
        change(table);
        write_file(average(person, condition),
                   number_table_text(table.columns, {}, table.values, 17));
      }
  }
  ProgramRun run(std::vector<std::string> more = {}) const {
    std::vector<std::string> arguments{"run", "experiment.toml", "--quiet", "--jobs", "1"};
    arguments.insert(arguments.end(), more.begin(), more.end());
    return run_program(arguments, folder);
  }
};

/// Line `line` (from 1) of the text, with its first `what` replaced.
inline std::string with_in_line(const std::string& text, int line, const std::string& what,
                                const std::string& instead) {
  std::istringstream lines(text);
  std::string result, each;
  for (int number = 1; std::getline(lines, each); ++number)
    result += (number == line ? with(each, what, instead) : each) + "\n";
  return result;
}

/// The table with its column `column` (from 0) taken out, or its cells passed through `change`.
template <typename Change>
std::string change_rows(const std::string& text, const Change& change) {
  std::istringstream lines(text);
  std::string result, each;
  for (int number = 1; std::getline(lines, each); ++number) {
    std::vector<std::string> cells;
    std::istringstream row(each);
    for (std::string cell; std::getline(row, cell, '\t');) cells.push_back(cell);
    change(number, cells);
    for (std::size_t i = 0; i < cells.size(); ++i) result += (i ? "\t" : "") + cells[i];
    result += "\n";
  }
  return result;
}

}  // namespace headwater
