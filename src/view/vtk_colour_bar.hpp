// SPDX-License-Identifier: GPL-3.0-or-later
// A horizontal colour bar with round ticks and a heading that names quantity and unit.
#pragma once
#include "view/axis_ticks.hpp"
#include "view/vtk_canvas.hpp"

#include <functional>
#include <string>

namespace headwater {

struct ColourBar {
  std::string heading;
  TickScale scale;
  bool both_signs = false;            ///< from -top to top instead of 0 to top
  std::function<Rgb(double)> colour;  ///< of value / top
};

/// Height that draw_colour_bar uses, from the heading to the ticks' numbers.
double colour_bar_height(const TextStyle& style);
/// Draws the bar with its upper left corner at (x, y).
void draw_colour_bar(Canvas& canvas, const ColourBar& bar, double x, double y, double width,
                     const TextStyle& style);

}  // namespace headwater
