// SPDX-License-Identifier: GPL-3.0-or-later
#include "view/vtk_scalp_scene.hpp"

#include "view/colour.hpp"
#include "view/flat_map.hpp"

#include <headwater/base/units.hpp>
#include <headwater/signal/spherical_spline.hpp>

#include <vtkCellArray.h>
#include <vtkContourFilter.h>
#include <vtkDoubleArray.h>
#include <vtkIdList.h>
#include <vtkPointData.h>
#include <vtkPoints.h>
#include <vtkPolyData.h>

#include <algorithm>
#include <array>
#include <cmath>

namespace headwater {
namespace {

constexpr Rgb kInk{0.1, 0.1, 0.1}, kPaper{1, 1, 1};
constexpr double kDegree = kPi / 180;
constexpr double kOutline = 97 * kDegree;  // just outside the ring of Fpz, T7, Oz and T8
constexpr double kMargin = 5 * kDegree;    // of the map beyond the outermost electrode
constexpr int kRings = 72, kSpokes = 240;

/// The map on rings about the vertex: point 0, then ring by ring.
struct FlatMap {
  std::vector<Eigen::Vector2d> places;  // flat_position
  Eigen::VectorXd values;
  std::vector<Eigen::Vector3i> triangles;
};

/// Where the map ends (angle from the vertex) in each direction of a spoke: a little outside the
/// outermost electrode thereabouts. An electrode counts less the further it stands to the side
/// (by the squared cosine), so that a low mastoid does not stretch the map over the face.
std::vector<double> map_edge(const SourcePicture& picture) {
  std::vector<double> edge(kSpokes, 0);
  for (int spoke = 0; spoke < kSpokes; ++spoke) {
    const double angle = 2 * kPi * spoke / kSpokes;
    const Eigen::Vector2d way(std::cos(angle), std::sin(angle));
    double& reach = edge[static_cast<std::size_t>(spoke)];
    for (Eigen::Index i = 0; i < picture.directions.cols(); ++i) {
      const Eigen::Vector2d place = flat_position(picture.directions.col(i));
      const double along = place.dot(way);  // distance times the cosine of the angle to the spoke
      if (along > 0) reach = std::max(reach, along * along / place.norm());
    }
  }
  // A running mean over 21 degrees takes the scallops between neighbours away.
  constexpr int half = kSpokes * 21 / 720;
  std::vector<double> smooth(kSpokes, 0);
  for (int spoke = 0; spoke < kSpokes; ++spoke) {
    double& mean = smooth[static_cast<std::size_t>(spoke)];
    for (int k = -half; k <= half; ++k)
      mean += edge[static_cast<std::size_t>((spoke + k + kSpokes) % kSpokes)] / (2 * half + 1);
    mean = std::min(mean + kMargin, kPi);
  }
  return smooth;
}

FlatMap flat_map(const SourcePicture& picture, const std::vector<double>& edge) {
  FlatMap map;
  map.places.emplace_back(0, 0);
  const auto at = [](int ring, int spoke) {
    return ring == 0 ? 0 : 1 + (ring - 1) * kSpokes + spoke % kSpokes;
  };
  for (int ring = 1; ring <= kRings; ++ring)
    for (int spoke = 0; spoke < kSpokes; ++spoke) {
      const double angle = 2 * kPi * spoke / kSpokes;
      map.places.emplace_back(edge[static_cast<std::size_t>(spoke)] * ring / kRings *
                              Eigen::Vector2d(std::cos(angle), std::sin(angle)));
      const int outer = at(ring, spoke), next = at(ring, spoke + 1);
      const int inner = at(ring - 1, spoke), inner_next = at(ring - 1, spoke + 1);
      map.triangles.emplace_back(inner, outer, next);
      if (ring > 1) map.triangles.emplace_back(inner, next, inner_next);
    }
  Eigen::Matrix3Xd directions(3, static_cast<Eigen::Index>(map.places.size()));
  for (std::size_t k = 0; k < map.places.size(); ++k)
    directions.col(static_cast<Eigen::Index>(k)) = unflattened(map.places[k]);
  map.values = spline_interpolation(picture.directions, directions) * picture.scalp_uV;
  return map;
}

/// Line segments of equal potential, two places each.
Canvas::Points isolines(const FlatMap& map, const std::vector<double>& levels) {
  vtkNew<vtkPoints> points;
  points->SetDataTypeToDouble();
  vtkNew<vtkDoubleArray> scalars;
  for (std::size_t k = 0; k < map.places.size(); ++k) {
    points->InsertNextPoint(map.places[k].x(), map.places[k].y(), 0);
    scalars->InsertNextValue(map.values(static_cast<Eigen::Index>(k)));
  }
  vtkNew<vtkCellArray> cells;
  for (const auto& t : map.triangles) {
    const std::array<vtkIdType, 3> ids{t[0], t[1], t[2]};
    cells->InsertNextCell(3, ids.data());
  }
  vtkNew<vtkPolyData> data;
  data->SetPoints(points);
  data->SetPolys(cells);
  data->GetPointData()->SetScalars(scalars);
  vtkNew<vtkContourFilter> contour;
  contour->SetInputData(data);
  for (std::size_t k = 0; k < levels.size(); ++k) contour->SetValue(static_cast<int>(k), levels[k]);
  contour->Update();
  Canvas::Points ends;
  vtkPolyData* lines = contour->GetOutput();
  vtkNew<vtkIdList> ids;
  for (lines->GetLines()->InitTraversal(); lines->GetLines()->GetNextCell(ids);)
    for (vtkIdType k = 0; k + 1 < ids->GetNumberOfIds(); ++k)
      for (const vtkIdType id : {ids->GetId(k), ids->GetId(k + 1)}) {
        std::array<double, 3> p{};
        lines->GetPoint(id, p.data());
        ends.emplace_back(p[0], p[1]);
      }
  return ends;
}

/// Places of the flat map in pixels.
struct Frame {
  Eigen::Vector2d centre;
  double px_per_radian;
  Eigen::Vector2d operator()(const Eigen::Vector2d& place) const {
    return centre + px_per_radian * Eigen::Vector2d(place.x(), -place.y());
  }
  Canvas::Points operator()(Canvas::Points places) const {
    for (auto& place : places) place = (*this)(place);
    return places;
  }
};

Canvas::Points arc(const Eigen::Vector2d& centre, const Eigen::Vector2d& radii, double from_degree,
                   double to_degree) {
  Canvas::Points points;
  constexpr int steps = 90;
  for (int k = 0; k <= steps; ++k) {
    const double angle = (from_degree + (to_degree - from_degree) * k / steps) * kDegree;
    points.emplace_back(centre +
                        Eigen::Vector2d(radii.x() * std::cos(angle), radii.y() * std::sin(angle)));
  }
  return points;
}

void draw_head(Canvas& canvas, const Frame& frame, double width) {
  const double r = kOutline;
  canvas.line(frame(arc({0, 0}, {r, r}, 0, 360)), width, kInk);
  const double half = 9 * kDegree;  // of the nose, as an angle about the vertex
  const auto on_circle = [&](double angle) {
    return Eigen::Vector2d(r * std::sin(angle), r * std::cos(angle));
  };
  canvas.line(frame({on_circle(-half), {0, 1.11 * r}, on_circle(half)}), width, kInk);
  for (const double side : {-1.0, 1.0})
    canvas.line(frame(arc({side * 0.995 * r, -0.02 * r}, {side * 0.085 * r, 0.17 * r}, -85, 85)),
                width, kInk);
}

}  // namespace

TickScale scalp_scale(const SourcePicture& picture) {
  return tick_scale(picture.scalp_uV.cwiseAbs().maxCoeff(), 3);
}

void draw_scalp_map(Canvas& canvas, const SourcePicture& picture, const Eigen::Vector2d& centre,
                    double width, const TextStyle& style) {
  const std::vector<double> edge = map_edge(picture);
  const double pen = style.size_px / 14;
  const double reach = std::max(*std::max_element(edge.begin(), edge.end()), 1.12 * kOutline);
  const Frame frame{centre, width / 2 / reach};
  const TickScale scale = scalp_scale(picture);
  const FlatMap map = flat_map(picture, edge);
  std::vector<Rgb> colours;
  for (const double value : map.values) colours.push_back(balance_colour(value / scale.top));
  canvas.shaded(frame(map.places), map.triangles, colours);
  std::vector<double> levels;
  for (double level = scale.step / 2; level < scale.top; level += scale.step / 2)
    for (const double sign : {-1.0, 1.0}) levels.push_back(sign * level);
  canvas.segments(frame(isolines(map, levels)), 0.5 * pen, {0.35, 0.35, 0.35});
  canvas.segments(frame(isolines(map, {0.0})), 1.1 * pen, {0.35, 0.35, 0.35});
  draw_head(canvas, frame, 1.4 * pen);
  for (Eigen::Index i = 0; i < picture.directions.cols(); ++i) {
    const Eigen::Vector2d place = frame(flat_position(picture.directions.col(i)));
    canvas.disc(place, 2.2 * pen, kPaper);
    canvas.disc(place, 1.6 * pen, kInk);
  }
  const double corner = 0.88 * reach;
  canvas.text(frame(Eigen::Vector2d(-corner, corner)), "L", style, Align::centre);
  canvas.text(frame(Eigen::Vector2d(corner, corner)), "R", style, Align::centre);
}

}  // namespace headwater
