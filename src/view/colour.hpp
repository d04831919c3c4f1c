// SPDX-License-Identifier: GPL-3.0-or-later
// The two colour scales of the pictures, made by formula in a perceptual space, so that equal steps
// of the value look like equal steps of colour and the order survives grey print and colour
// blindness.
//
//   amplitude_colour  zero = warm white, largest = deep violet, by way of apricot: lightness falls
//                     all the way.
//   balance_colour    -1 = blue, 0 = near white, +1 = brown: lightness depends on |t| alone.
//
// Space: Oklab (Ottosson 2020, "A perceptual color space for image processing"); L 0 (black) to 1
// (white). Every colour of both scales lies inside sRGB, so nothing is clipped.
#pragma once

namespace headwater {

struct Rgb {  ///< sRGB with its transfer curve, each 0 to 1
  double red = 0, green = 0, blue = 0;
};

struct Oklab {
  double L = 0, a = 0, b = 0;
};

Oklab to_oklab(const Rgb& colour);
/// The nearest sRGB colour, component by component.
Rgb to_rgb(const Oklab& colour);

/// t from 0 to 1; values outside are taken as the nearest end.
Rgb amplitude_colour(double t);

/// t from -1 to 1; values outside are taken as the nearest end.
Rgb balance_colour(double t);

}  // namespace headwater
