// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/app/forward_model.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/table.hpp>
#include <headwater/base/units.hpp>
#include <headwater/model/lead_field.hpp>

#include <fmt/core.h>

namespace headwater {
namespace {

SourceGrid read_points(const Experiment& experiment, double scalp_radius_m) {
  const Table table = read_table(*experiment.points_table, "source points");
  const std::size_t columns[] = {table.column("x_mm"), table.column("y_mm"), table.column("z_mm")};
  const auto name = table.column("name");
  Labels names;
  Eigen::Matrix3Xd points(3, static_cast<Eigen::Index>(table.rows.size()));
  for (std::size_t row = 0; row < table.rows.size(); ++row) {
    names.push_back(table.rows[row][name]);
    for (Eigen::Index axis = 0; axis < 3; ++axis)
      points(axis, static_cast<Eigen::Index>(row)) = table.number(row, columns[axis]) * kMillimetre;
  }
  if (const auto repeated = repeated_labels(names); !repeated.empty())
    throw InputError(table.source + ": repeated point names: " + join_labels(repeated) + ".");
  return point_grid(names, points, experiment.point_space, scalp_radius_m);
}

/// Electrodes are used as directions from the frame's origin: a table about another origin -
/// between the ears, say - would turn all of them without a word.
constexpr double kLargestOffset = 25 * kMillimetre;

SphereFit centred_sphere(const Montage& table, const std::string& path) {
  SphereFit fit = fit_head_sphere(table);
  if (fit.centre.norm() > kLargestOffset)
    throw InputError(fmt::format(
        "{}: the sphere through the electrodes has its centre at ({:.0f}, {:.0f}, {:.0f}) mm, "
        "{:.0f} mm from "
        "the origin of the head frame: expected within {:.0f} mm. Is the table in MNI space "
        "(montage.space = \"MNI\"), or digitised in a frame of its own (montage.space = \"own\", "
        "which fits it to the head)?",
        path, fit.centre.x() / kMillimetre, fit.centre.y() / kMillimetre,
        fit.centre.z() / kMillimetre, fit.centre.norm() / kMillimetre,
        kLargestOffset / kMillimetre));
  return fit;
}

/// What makes a cap unusable or doubtful, said in words.
void judge_fit(ParticipantCap& cap, const CapFit& fit) {
  if (fit.mirrored || fit.reversed) {
    std::string message = fmt::format("{}: the cap contradicts itself.", cap.source);
    for (const auto& note : fit.notes) message += " " + note + ".";
    throw InputError(message +
                     " Mend the table, its labels, or what its coordinate system says of axes and "
                     "landmarks.");
  }
  for (const auto& outlier : fit.outliers)
    cap.notes.push_back(fmt::format(
        "electrode {} lies {:.0f} degrees from where its name belongs and {:.0f} mm off the sphere",
        outlier.name, outlier.angle_deg, outlier.off_sphere_m / kMillimetre));
  cap.notes.insert(cap.notes.end(), fit.notes.begin(), fit.notes.end());
}

}  // namespace

ParticipantCap read_participant_cap(const Experiment& experiment, const std::string& participant) {
  ParticipantCap cap;
  if (experiment.positions == "standard") {
    cap.source = "standard positions";
    return cap;
  }
  const auto path = fill_pattern(experiment.positions, participant, "");
  cap.source = path.string();
  if (experiment.position_space == CapSpace::own) {
    const DigitisedCap digitised = read_cap(path);
    cap.notes = digitised.notes;
    cap.fit = fit_cap(digitised);
    judge_fit(cap, *cap.fit);
    cap.table = cap.fit->montage;
    cap.sphere = cap.fit->sphere;
    return cap;
  }
  cap.table = read_positions(
      path, experiment.position_space == CapSpace::mni ? PositionSpace::mni : PositionSpace::head);
  cap.sphere = centred_sphere(cap.table, cap.source);
  return cap;
}

Montage montage_of(const Experiment& experiment, const ParticipantCap& cap,
                   const Labels& channels) {
  const auto& radii = experiment.head.radii_m;
  if (cap.table.labels.empty()) return standard_montage(channels, radii[radii.size() - 1]);
  return select_positions(cap.table, channels, cap.source);
}

std::shared_ptr<const ForwardModel> build_forward_model(const Experiment& experiment,
                                                        const Montage& montage,
                                                        const SphereFit& sphere) {
  auto model = std::make_shared<ForwardModel>();
  model->montage = montage;
  model->sphere = sphere;
  model->head = experiment.head;
  auto& radii = model->head.radii_m;
  if (experiment.fit_radius) radii *= sphere.radius / radii[radii.size() - 1];
  check_head(model->head);
  const double scalp = radii[radii.size() - 1];
  model->grid = experiment.points_table ? read_points(experiment, scalp)
                                        : lattice_grid(experiment.spacing_m, scalp);
  const auto& grid = model->grid;
  model->labels = experiment.atlas ? atlas_labels(grid, *experiment.atlas, *experiment.atlas_table)
                                   : template_labels(grid);
  model->lobes = lobe_regions(model->labels);
  model->regions = experiment.regions.empty()
                       ? model->lobes
                       : requested_regions(model->labels, experiment.regions);
  model->neighbours = grid_neighbours(grid);
  model->outward = grid.head_m.colwise().normalized();
  model->gain = compute_gain(model->head, montage.positions, grid.head_m);
  return model;
}

std::shared_ptr<const ForwardModel> ForwardModels::of(const Montage& montage,
                                                      const SphereFit& sphere) {
  const std::lock_guard<std::mutex> lock(mutex_);
  for (const auto& model : built_)
    if (model->montage.labels == montage.labels && model->montage.positions == montage.positions)
      return model;
  built_.push_back(build_forward_model(*experiment_, montage, sphere));
  return built_.back();
}

}  // namespace headwater
