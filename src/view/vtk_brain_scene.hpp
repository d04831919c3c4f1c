// SPDX-License-Identifier: GPL-3.0-or-later
// The template brain with the map on it, seen from one side, and the marks in front of it.
//
// Marks are drawn flat over the brain, hence seen through it. Filled: at most 25 mm of brain lie
// between the mark and the viewer. Hollow: it lies deeper, or towards the far side. A view from the
// left or right shows the marks of its own hemisphere and of the midline only: a mirrored pair
// would else fall on one place.
#pragma once
#include "view/axis_ticks.hpp"
#include "view/brain_surface.hpp"
#include "view/vtk_canvas.hpp"

#include <headwater/view/source_picture.hpp>

#include <vtkNew.h>
#include <vtkPolyDataMapper.h>

#include <array>
#include <string>

namespace headwater {

struct BrainSide {
  const char* name;
  Eigen::Vector3d towards_viewer, up;
  const char *left_letter, *right_letter, *top_letter, *bottom_letter;
  Eigen::Vector3d right() const { return up.cross(towards_viewer); }  ///< to the viewer's right
};

enum Side { kLeft, kRight, kTop, kFront };
const std::array<BrainSide, 4>& brain_sides();

/// Where a view stands in the picture: its middle in pixels, its extent, its scale.
struct BrainPanel {
  Eigen::Vector2d centre, size;
  double px_per_mm = 3;
};

class BrainScene {
 public:
  BrainScene(SurfaceMesh mesh, const Eigen::VectorXd& painted, const TickScale& scale);
  /// Width and height (mm) of the brain seen from a side.
  Eigen::Vector2d extent_mm(const BrainSide& side) const;
  /// The renderer that draws the brain in its panel of a picture of the given size (pixels).
  vtkSmartPointer<vtkRenderer> view(const BrainSide& side, const BrainPanel& panel,
                                    const Eigen::Vector2d& picture_px) const;
  void draw_marks(Canvas& canvas, const BrainSide& side, const BrainPanel& panel,
                  const std::vector<PictureMark>& marks, const TextStyle& style) const;

 private:
  Eigen::Vector3d middle_mm(const BrainSide& side) const;
  SurfaceMesh mesh_;
  vtkNew<vtkPolyDataMapper> mapper_;
};

/// The sign of a mark: disc, or diamond for half of a pair; filled or hollow.
void draw_mark(Canvas& canvas, const Eigen::Vector2d& centre, double radius, bool pair,
               bool filled);

}  // namespace headwater
