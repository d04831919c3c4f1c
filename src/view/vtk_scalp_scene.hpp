// SPDX-License-Identifier: GPL-3.0-or-later
// The scalp map: the head from above laid flat (azimuthal equidistant), nose up, left on the left;
// colours and lines of equal potential by spherical splines, electrodes as dots. In every direction
// the map ends a little outside the outermost electrode: nothing is shown where nothing was
// measured.
#pragma once
#include "view/axis_ticks.hpp"
#include "view/vtk_canvas.hpp"

#include <headwater/view/source_picture.hpp>

namespace headwater {

/// The colour scale of the scalp map, symmetric about zero.
TickScale scalp_scale(const SourcePicture& picture);

/// Draws the map into the square of the given middle and width (pixels), nose and ears included.
void draw_scalp_map(Canvas& canvas, const SourcePicture& picture, const Eigen::Vector2d& centre,
                    double width, const TextStyle& style);

}  // namespace headwater
