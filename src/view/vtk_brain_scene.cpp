// SPDX-License-Identifier: GPL-3.0-or-later
#include "view/vtk_brain_scene.hpp"

#include <headwater/base/units.hpp>

#include <Eigen/Geometry>
#include <vtkActor.h>
#include <vtkCamera.h>
#include <vtkCellArray.h>
#include <vtkFloatArray.h>
#include <vtkLight.h>
#include <vtkPointData.h>
#include <vtkPolyData.h>
#include <vtkProperty.h>
#include <vtkUnsignedCharArray.h>

#include <cmath>
#include <limits>
#include <utility>

namespace headwater {
namespace {

constexpr Rgb kInk{0.08, 0.08, 0.08}, kPaper{1, 1, 1};
constexpr double kMidline_mm = 10;  // marks nearer to the midline are shown from both sides

/// The smallest and the largest coordinate of the surface along a direction.
std::pair<double, double> range_along(const SurfaceMesh& mesh, const Eigen::Vector3d& direction) {
  const Eigen::VectorXd along = mesh.vertices_mm.transpose() * direction;
  return {along.minCoeff(), along.maxCoeff()};
}

vtkSmartPointer<vtkPolyData> coloured_surface(const SurfaceMesh& mesh,
                                              const Eigen::VectorXd& painted,
                                              const TickScale& scale) {
  vtkNew<vtkPoints> points;
  vtkNew<vtkFloatArray> normals;
  normals->SetNumberOfComponents(3);
  vtkNew<vtkUnsignedCharArray> colours;
  colours->SetNumberOfComponents(3);
  for (Eigen::Index v = 0; v < mesh.vertices_mm.cols(); ++v) {
    points->InsertNextPoint(mesh.vertices_mm.col(v).data());
    normals->InsertNextTuple(mesh.normals.col(v).data());
    const Rgb c = amplitude_colour(painted(v) / scale.top);
    colours->InsertNextTuple3(std::round(255 * c.red), std::round(255 * c.green),
                              std::round(255 * c.blue));
  }
  vtkNew<vtkCellArray> cells;
  for (Eigen::Index t = 0; t < mesh.triangles.cols(); ++t) {
    const std::array<vtkIdType, 3> ids{mesh.triangles(0, t), mesh.triangles(1, t),
                                       mesh.triangles(2, t)};
    cells->InsertNextCell(3, ids.data());
  }
  auto data = vtkSmartPointer<vtkPolyData>::New();
  data->SetPoints(points);
  data->SetPolys(cells);
  data->GetPointData()->SetNormals(normals);
  data->GetPointData()->SetScalars(colours);
  return data;
}

/// Light from the viewer and a little from above, the same on both sides: mirror images stay so.
void add_light(vtkRenderer* renderer) {
  vtkNew<vtkLight> light;
  light->SetLightTypeToCameraLight();
  light->SetPosition(0, 0.3, 1);
  light->SetFocalPoint(0, 0, 0);
  renderer->SetAutomaticLightCreation(false);
  renderer->AddLight(light);
}

struct DrawnMark {
  Eigen::Vector2d place;
  const PictureMark* mark;
  bool filled;
};

/// Beside the mark, where the least of other marks and of labels already placed is covered; at
/// equal cover the first in the order below.
Eigen::Vector2d label_place(const DrawnMark& mark, const std::vector<DrawnMark>& all,
                            const Canvas::Points& labels, double reach) {
  static const std::array<Eigen::Vector2d, 8> ways{{{0.75, -0.75},
                                                    {-0.75, -0.75},
                                                    {0.75, 0.75},
                                                    {-0.75, 0.75},
                                                    {1, 0},
                                                    {-1, 0},
                                                    {0, -1},
                                                    {0, 1}}};
  Eigen::Vector2d best = mark.place;
  double least = std::numeric_limits<double>::infinity();
  for (const auto& way : ways) {
    const Eigen::Vector2d place = mark.place + reach * way;
    double cover = 0;
    const auto add = [&](const Eigen::Vector2d& other) {
      cover += std::max(0.0, 1 - (other - place).norm() / reach);
    };
    for (const auto& other : all)
      if (&other != &mark) add(other.place);
    for (const auto& label : labels) add(label);
    if (cover < least - 1e-9) least = cover, best = place;
  }
  return best;
}

}  // namespace

const std::array<BrainSide, 4>& brain_sides() {
  using Eigen::Vector3d;
  static const std::array<BrainSide, 4> sides{{
      {"left", -Vector3d::UnitX(), Vector3d::UnitZ(), "A", "P", "", ""},
      {"right", Vector3d::UnitX(), Vector3d::UnitZ(), "P", "A", "", ""},
      {"top", Vector3d::UnitZ(), Vector3d::UnitY(), "L", "R", "A", "P"},
      {"front", Vector3d::UnitY(), Vector3d::UnitZ(), "R", "L", "", ""},
  }};
  return sides;
}

BrainScene::BrainScene(SurfaceMesh mesh, const Eigen::VectorXd& painted, const TickScale& scale)
    : mesh_(std::move(mesh)) {
  mapper_->SetInputData(coloured_surface(mesh_, painted, scale));
}

Eigen::Vector2d BrainScene::extent_mm(const BrainSide& side) const {
  const auto [left, right] = range_along(mesh_, side.right());
  const auto [bottom, top] = range_along(mesh_, side.up);
  return {right - left, top - bottom};
}

Eigen::Vector3d BrainScene::middle_mm(const BrainSide& side) const {
  const auto [left, right] = range_along(mesh_, side.right());
  const auto [bottom, top] = range_along(mesh_, side.up);
  return (left + right) / 2 * side.right() + (bottom + top) / 2 * side.up;
}

vtkSmartPointer<vtkRenderer> BrainScene::view(const BrainSide& side, const BrainPanel& panel,
                                              const Eigen::Vector2d& picture_px) const {
  auto renderer = vtkSmartPointer<vtkRenderer>::New();
  renderer->SetBackground(1, 1, 1);
  vtkNew<vtkActor> actor;
  actor->SetMapper(mapper_);
  actor->GetProperty()->SetInterpolationToPhong();
  actor->GetProperty()->SetAmbient(0.5);
  actor->GetProperty()->SetDiffuse(0.55);
  renderer->AddActor(actor);
  add_light(renderer);
  const Eigen::Vector2d low = panel.centre - panel.size / 2, high = panel.centre + panel.size / 2;
  renderer->SetViewport(low.x() / picture_px.x(), 1 - high.y() / picture_px.y(),
                        high.x() / picture_px.x(), 1 - low.y() / picture_px.y());
  const Eigen::Vector3d focus = middle_mm(side), eye = focus + 500 * side.towards_viewer;
  vtkCamera* camera = renderer->GetActiveCamera();
  camera->ParallelProjectionOn();
  camera->SetFocalPoint(focus.data());
  camera->SetPosition(eye.data());
  camera->SetViewUp(side.up.data());
  camera->SetParallelScale(panel.size.y() / 2 / panel.px_per_mm);
  camera->SetClippingRange(300, 700);
  return renderer;
}

void BrainScene::draw_marks(Canvas& canvas, const BrainSide& side, const BrainPanel& panel,
                            const std::vector<PictureMark>& marks, const TextStyle& style) const {
  const double radius = 0.4 * style.size_px;
  std::vector<DrawnMark> drawn;
  for (const PictureMark& mark : marks) {
    if (side.towards_viewer.x() * mark.mni_mm.x() < -kMidline_mm) continue;  // the other hemisphere
    const Eigen::Vector3d offset = mark.mni_mm - middle_mm(side);
    const Eigen::Vector2d place =
        panel.centre +
        panel.px_per_mm * Eigen::Vector2d(offset.dot(side.right()), -offset.dot(side.up));
    drawn.push_back(
        {place, &mark, depth_seen_mm(mark.mni_mm, side.towards_viewer) <= kShownDepth_mm});
  }
  Canvas::Points labels;
  for (const DrawnMark& mark : drawn)
    draw_mark(canvas, mark.place, radius, mark.mark->pair, mark.filled);
  for (const DrawnMark& mark : drawn) {
    labels.push_back(label_place(mark, drawn, labels, radius + 0.65 * style.size_px));
    canvas.text_with_rim(labels.back(), mark.mark->label, style);
  }
}

void draw_mark(Canvas& canvas, const Eigen::Vector2d& centre, double radius, bool pair,
               bool filled) {
  // A disc as a polygon of many corners, a diamond of about the same weight as one of four.
  const int corners = pair ? 4 : 48;
  const double reach = pair ? 1.3 * radius : radius;
  Canvas::Points outline;
  for (int k = 0; k <= corners; ++k) {
    const double angle = 2 * kPi * k / corners;
    outline.push_back(centre + reach * Eigen::Vector2d(std::cos(angle), std::sin(angle)));
  }
  canvas.line(outline, 0.75 * radius, kPaper);
  canvas.line(outline, 0.4 * radius, kInk);
  if (!filled) return;
  outline.pop_back();
  canvas.polygon(outline, kInk);
}

}  // namespace headwater
