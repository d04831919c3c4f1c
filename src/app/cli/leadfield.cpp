// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/cli/command.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/table.hpp>
#include <headwater/base/units.hpp>
#include <headwater/model/lead_field.hpp>
#include <headwater/signal/reference.hpp>

#include <fmt/core.h>

namespace headwater::cli {
namespace {

struct Options {
  std::string electrodes, points, output, reference = "none";
  std::vector<double> radii_mm, conductivity;
};

struct NamedPoints {
  Labels names;
  Eigen::Matrix3Xd positions_m;
};

NamedPoints read_points(const std::string& path, const char* what) {
  const Table table = read_table(path, what);
  const auto name = table.column("name");
  const std::size_t axes[] = {table.column("x_mm"), table.column("y_mm"), table.column("z_mm")};
  NamedPoints points;
  points.positions_m.resize(3, static_cast<Eigen::Index>(table.rows.size()));
  for (std::size_t row = 0; row < table.rows.size(); ++row) {
    points.names.push_back(table.rows[row][name]);
    for (Eigen::Index axis = 0; axis < 3; ++axis)
      points.positions_m(axis, static_cast<Eigen::Index>(row)) =
          table.number(row, axes[axis]) * kMillimetre;
  }
  if (const auto repeated = repeated_labels(points.names); !repeated.empty())
    throw InputError(fmt::format("{}: repeated names: {}.", path, join_labels(repeated)));
  return points;
}

/// Says by name which electrodes have no direction and which points lie outside the brain.
void check_points(const Options& options, const HeadModel& head, const NamedPoints& electrodes,
                  const NamedPoints& points) {
  std::string problems;
  for (std::size_t m = 0; m < electrodes.names.size(); ++m)
    if (!(electrodes.positions_m.col(static_cast<Eigen::Index>(m)).norm() > 0))
      problems += fmt::format("{}: electrode '{}' lies at the origin: it has no direction.\n",
                              options.electrodes, electrodes.names[m]);
  for (std::size_t p = 0; p < points.names.size(); ++p)
    if (const double r = points.positions_m.col(static_cast<Eigen::Index>(p)).norm();
        !(r < head.radii_m[0]))
      problems += fmt::format(
          "{}: point '{}' lies {:g} mm from the centre, outside the innermost shell ({:g} mm). "
          "Points belong inside it, in the head frame and in mm.\n",
          options.points, points.names[p], r / kMillimetre, head.radii_m[0] / kMillimetre);
  if (problems.empty()) return;
  problems.pop_back();
  throw InputError(problems);
}

void write_lead_field(const Options& options) {
  HeadModel head;
  head.radii_m = Eigen::Map<const Eigen::VectorXd>(
                     options.radii_mm.data(), static_cast<Eigen::Index>(options.radii_mm.size())) *
                 kMillimetre;
  head.conductivity_S_per_m = Eigen::Map<const Eigen::VectorXd>(
      options.conductivity.data(), static_cast<Eigen::Index>(options.conductivity.size()));
  check_head(head);
  const NamedPoints electrodes = read_points(options.electrodes, "electrodes");
  const NamedPoints points = read_points(options.points, "source points");
  check_points(options, head, electrodes, points);
  Eigen::MatrixXd gain = compute_gain(head, electrodes.positions_m, points.positions_m);
  if (options.reference == "average") gain = average_reference(gain.rows()) * gain;
  Labels columns{"name"};
  for (const auto& point : points.names)
    for (const char* axis : {"_x", "_y", "_z"}) columns.push_back(point + axis);
  write_file(options.output, number_table_text(columns, electrodes.names, gain, 17));
}

}  // namespace

void add_leadfield(CLI::App& program, Outcome&) {
  auto options = std::make_shared<Options>();
  auto* command = program.add_subcommand(
      "leadfield", "Lead field of electrodes and points in concentric shells, V/(A m), as a table");
  command
      ->add_option("--electrodes", options->electrodes,
                   "Table name x_mm y_mm z_mm, head frame; used as directions")
      ->required();
  command->add_option("--points", options->points, "Table name x_mm y_mm z_mm, head frame")
      ->required();
  command
      ->add_option("--radii-mm", options->radii_mm, "Radii of the shells, from inside to outside")
      ->delimiter(',')
      ->allow_extra_args(false)
      ->required();
  command->add_option("--conductivity-S-per-m", options->conductivity, "Conductivity of each shell")
      ->delimiter(',')
      ->allow_extra_args(false)
      ->required();
  command
      ->add_option("--reference", options->reference,
                   "none (zero mean over the outer sphere) or average (of the electrodes)")
      ->check(CLI::IsMember({"none", "average"}));
  command->add_option("--output", options->output, "Table to write")->required();
  command->footer(
      "Example: headwater leadfield --electrodes results/electrodes.tsv --points "
      "results/points.tsv --radii-mm 80,85,92 --conductivity-S-per-m 0.33,0.0132,0.33 "
      "--output leadfield.tsv");
  command->callback([options] { write_lead_field(*options); });
}

}  // namespace headwater::cli
