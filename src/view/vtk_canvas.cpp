// SPDX-License-Identifier: GPL-3.0-or-later
#include "view/vtk_canvas.hpp"

#include <headwater/base/error.hpp>
#include <headwater/base/units.hpp>

#include <fmt/core.h>
#include <vtkActor2D.h>
#include <vtkCellArray.h>
#include <vtkPointData.h>
#include <vtkPoints.h>
#include <vtkPolyData.h>
#include <vtkPolyDataMapper2D.h>
#include <vtkTextActor.h>
#include <vtkTextProperty.h>
#include <vtkTextRenderer.h>
#include <vtkUnsignedCharArray.h>

#include <array>
#include <cmath>
#include <cstdlib>
#include <sstream>

namespace headwater {
namespace {

constexpr int kDotsPerInch = 72;  // so that a font size is in pixels

void set_style(vtkTextProperty* property, const Fonts& fonts, const TextStyle& style) {
  property->SetFontFamily(VTK_FONT_FILE);
  property->SetFontFile(fonts.file(style.bold).c_str());
  property->SetFontSize(static_cast<int>(std::lround(style.size_px * kOversampling)));
  property->SetColor(style.colour.red, style.colour.green, style.colour.blue);
}

std::filesystem::path font_folder() {
  constexpr const char* file = "DejaVuSans.ttf";
  std::vector<std::filesystem::path> folders{"/usr/share/fonts/truetype/dejavu",
                                             "/usr/share/fonts/dejavu-sans-fonts",
                                             "/usr/share/fonts/TTF", "/usr/share/fonts/dejavu"};
  if (const char* given = std::getenv("HEADWATER_FONT_FOLDER"); given && *given) folders = {given};
  std::string searched;
  for (const auto& folder : folders) {
    std::error_code ignored;
    if (std::filesystem::exists(folder / file, ignored) &&
        std::filesystem::exists(folder / "DejaVuSans-Bold.ttf", ignored))
      return folder;
    searched += (searched.empty() ? "" : ", ") + folder.string();
  }
  throw ResourceError(
      fmt::format("Pictures need the fonts {} and DejaVuSans-Bold.ttf, which are not in {}. "
                  "Install the package "
                  "fonts-dejavu-core, or name their folder in HEADWATER_FONT_FOLDER.",
                  file, searched));
}

}  // namespace

Fonts::Fonts() {
  const auto folder = font_folder();
  regular_ = folder / "DejaVuSans.ttf";
  bold_ = folder / "DejaVuSans-Bold.ttf";
}

double Fonts::width(const std::string& text, const TextStyle& style) const {
  vtkNew<vtkTextProperty> property;
  set_style(property, *this, style);
  std::array<int, 4> box{};
  if (text.empty() ||
      !vtkTextRenderer::GetInstance()->GetBoundingBox(property, text, box.data(), kDotsPerInch))
    return 0;
  return static_cast<double>(box[1] - box[0] + 1) / kOversampling;
}

std::vector<std::string> Fonts::wrapped(const std::string& text, const TextStyle& style,
                                        double width_px) const {
  std::vector<std::string> lines;
  std::istringstream words(text);
  std::string word, line;
  while (std::getline(words, word, ' ')) {  // two spaces give an empty word, and so stay two
    const std::string longer = line.empty() ? word : line + " " + word;
    if (!line.empty() && width(longer, style) > width_px) {
      lines.push_back(line);
      line = word;
    } else {
      line = longer;
    }
  }
  if (!line.empty()) lines.push_back(line);
  return lines;
}

struct Canvas::Shape {
  vtkNew<vtkPoints> points;
  vtkNew<vtkCellArray> cells;
  vtkNew<vtkUnsignedCharArray> colours;

  Shape() { colours->SetNumberOfComponents(3); }
  vtkIdType add_point(const Eigen::Vector2d& place, const Rgb& colour) {
    const auto byte = [](double x) { return std::round(255 * x); };
    colours->InsertNextTuple3(byte(colour.red), byte(colour.green), byte(colour.blue));
    return points->InsertNextPoint(place.x(), place.y(), 0);
  }
  void add_polygon(const Points& corners, const Rgb& colour) {
    std::vector<vtkIdType> ids;
    for (const auto& corner : corners) ids.push_back(add_point(corner, colour));
    cells->InsertNextCell(static_cast<vtkIdType>(ids.size()), ids.data());
  }
  void add_disc(const Eigen::Vector2d& centre, double radius, const Rgb& colour) {
    const int corners = 12 + static_cast<int>(radius);
    Points circle;
    for (int k = 0; k < corners; ++k) {
      const double angle = 2 * kPi * k / corners;
      circle.push_back(centre + radius * Eigen::Vector2d(std::cos(angle), std::sin(angle)));
    }
    add_polygon(circle, colour);
  }
  void add_segment(const Eigen::Vector2d& a, const Eigen::Vector2d& b, double width,
                   const Rgb& colour) {
    if ((b - a).norm() == 0) return;
    const Eigen::Vector2d along = (b - a).normalized() * (width / 2);
    const Eigen::Vector2d across(-along.y(), along.x());
    add_polygon({a + across, b + across, b - across, a - across}, colour);
  }
};

void Canvas::add(const Shape& shape) {
  for (vtkIdType i = 0; i < shape.points->GetNumberOfPoints(); ++i) {
    std::array<double, 3> p{};
    shape.points->GetPoint(i, p.data());
    shape.points->SetPoint(i, p[0] * kOversampling, (height_px_ - p[1]) * kOversampling, 0);
  }
  vtkNew<vtkPolyData> data;
  data->SetPoints(shape.points);
  data->SetPolys(shape.cells);
  data->GetPointData()->SetScalars(shape.colours);
  vtkNew<vtkPolyDataMapper2D> mapper;
  mapper->SetInputData(data);
  vtkNew<vtkActor2D> actor;
  actor->SetMapper(mapper);
  renderer_->AddViewProp(actor);
}

void Canvas::polygon(const Points& corners, const Rgb& colour) {
  Shape shape;
  shape.add_polygon(corners, colour);
  add(shape);
}

void Canvas::rectangle(double x, double y, double width, double height, const Rgb& colour) {
  polygon({{x, y}, {x + width, y}, {x + width, y + height}, {x, y + height}}, colour);
}

void Canvas::disc(const Eigen::Vector2d& centre, double radius, const Rgb& colour) {
  Shape shape;
  shape.add_disc(centre, radius, colour);
  add(shape);
}

void Canvas::line(const Points& points, double width, const Rgb& colour) {
  Shape shape;
  for (std::size_t k = 0; k < points.size(); ++k) {
    shape.add_disc(points[k], width / 2, colour);
    if (k > 0) shape.add_segment(points[k - 1], points[k], width, colour);
  }
  add(shape);
}

void Canvas::segments(const Points& ends, double width, const Rgb& colour) {
  Shape shape;
  for (std::size_t k = 0; k + 1 < ends.size(); k += 2)
    shape.add_segment(ends[k], ends[k + 1], width, colour);
  add(shape);
}

void Canvas::shaded(const Points& points, const std::vector<Eigen::Vector3i>& triangles,
                    const std::vector<Rgb>& colours) {
  Shape shape;
  for (std::size_t k = 0; k < points.size(); ++k) shape.add_point(points[k], colours[k]);
  for (const auto& t : triangles) {
    const std::array<vtkIdType, 3> ids{t[0], t[1], t[2]};
    shape.cells->InsertNextCell(3, ids.data());
  }
  add(shape);
}

void Canvas::text(const Eigen::Vector2d& place, const std::string& text, const TextStyle& style,
                  Align align) {
  if (text.empty()) return;
  vtkNew<vtkTextActor> actor;
  vtkTextProperty* property = actor->GetTextProperty();
  set_style(property, fonts_, style);
  property->SetVerticalJustificationToCentered();
  property->SetJustification(align == Align::left     ? VTK_TEXT_LEFT
                             : align == Align::centre ? VTK_TEXT_CENTERED
                                                      : VTK_TEXT_RIGHT);
  actor->SetInput(text.c_str());
  actor->SetPosition(std::round(place.x() * kOversampling),
                     std::round((height_px_ - place.y()) * kOversampling));
  renderer_->AddViewProp(actor);
}

void Canvas::text_with_rim(const Eigen::Vector2d& place, const std::string& words,
                           const TextStyle& style) {
  TextStyle rim = style;
  rim.colour = {1, 1, 1};
  for (int k = 0; k < 12; ++k) {
    const double angle = kPi * k / 6;
    const Eigen::Vector2d offset(std::cos(angle), std::sin(angle));
    text(place + style.size_px / 10 * offset, words, rim, Align::centre);
  }
  text(place, words, style, Align::centre);
}

}  // namespace headwater
