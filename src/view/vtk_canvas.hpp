// SPDX-License-Identifier: GPL-3.0-or-later
// A flat drawing surface on top of the scenes. Coordinates are pixels of the finished picture, x to
// the right, y down from the top; the picture is rendered larger by `kOversampling` and averaged.
#pragma once
#include "view/colour.hpp"

#include <Eigen/Core>
#include <vtkNew.h>
#include <vtkRenderer.h>

#include <filesystem>
#include <string>
#include <vector>

namespace headwater {

inline constexpr int kOversampling = 2;

enum class Align { left, centre, right };

struct TextStyle {
  double size_px = 36;
  bool bold = false;
  Rgb colour{0.1, 0.1, 0.1};
};

/// The two font files. Throws ResourceError naming fonts-dejavu-core when they are not there.
class Fonts {
 public:
  Fonts();
  const std::filesystem::path& file(bool bold) const { return bold ? bold_ : regular_; }
  double width(const std::string& text, const TextStyle& style) const;
  /// Lines no wider than width_px where words allow it; words are never cut.
  std::vector<std::string> wrapped(const std::string& text, const TextStyle& style,
                                   double width_px) const;

 private:
  std::filesystem::path regular_, bold_;
};

class Canvas {
 public:
  using Points = std::vector<Eigen::Vector2d>;

  Canvas(const Fonts& fonts, double height_px) : fonts_(fonts), height_px_(height_px) {}
  vtkRenderer* renderer() const { return renderer_; }
  const Fonts& fonts() const { return fonts_; }

  /// A filled convex polygon.
  void polygon(const Points& corners, const Rgb& colour);
  void rectangle(double x, double y, double width, double height, const Rgb& colour);
  void disc(const Eigen::Vector2d& centre, double radius, const Rgb& colour);
  /// An open line with round joints and ends.
  void line(const Points& points, double width, const Rgb& colour);
  /// Many separate segments (points 2k and 2k + 1).
  void segments(const Points& ends, double width, const Rgb& colour);
  /// Triangles with colours at their corners.
  void shaded(const Points& points, const std::vector<Eigen::Vector3i>& triangles,
              const std::vector<Rgb>& colours);
  /// One line of text; y is the middle of its height.
  void text(const Eigen::Vector2d& place, const std::string& text, const TextStyle& style,
            Align align = Align::left);
  /// The same on a white rim, legible on any ground.
  void text_with_rim(const Eigen::Vector2d& place, const std::string& text, const TextStyle& style);

 private:
  struct Shape;
  void add(const Shape& shape);
  const Fonts& fonts_;
  double height_px_;
  vtkNew<vtkRenderer> renderer_;
};

}  // namespace headwater
