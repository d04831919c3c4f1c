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
        "(montage.space = \"MNI\"), or about another origin? Shift it so that the centre is the "
        "origin.",
        path, fit.centre.x() / kMillimetre, fit.centre.y() / kMillimetre,
        fit.centre.z() / kMillimetre, fit.centre.norm() / kMillimetre,
        kLargestOffset / kMillimetre));
  return fit;
}

}  // namespace

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

std::shared_ptr<const ForwardModel> ForwardModels::of(const std::string& participant,
                                                      const Labels& channels) {
  if (experiment_->positions == "standard") {
    const auto& radii = experiment_->head.radii_m;
    return of(standard_montage(channels, radii[radii.size() - 1]), SphereFit{});
  }
  const auto path = fill_pattern(experiment_->positions, participant, "");
  const Montage table = read_positions(path, experiment_->position_space);
  return of(select_positions(table, channels, path.string()), centred_sphere(table, path.string()));
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
