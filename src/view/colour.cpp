// SPDX-License-Identifier: GPL-3.0-or-later
// Each scale is a quadratic Bezier curve in Oklab, walked at constant speed: the length of the
// curve up to a parameter is tabulated and inverted, so that equal steps of t are equal distances
// in the space. The lightness of the three control points falls, hence so does that of the curve.
#include "view/colour.hpp"

#include <algorithm>
#include <array>
#include <cmath>

namespace headwater {
namespace {

double mixed(double a, double b, double c, double s) {
  return (1 - s) * (1 - s) * a + 2 * s * (1 - s) * b + s * s * c;
}

class Curve {
 public:
  Curve(const Oklab& from, const Oklab& by_way_of, const Oklab& to)
      : from_(from), middle_(by_way_of), to_(to) {
    Oklab before = from;
    for (int k = 1; k <= kSteps; ++k) {
      const Oklab here = bezier(static_cast<double>(k) / kSteps);
      length_[k] =
          length_[k - 1] + std::hypot(here.L - before.L, here.a - before.a, here.b - before.b);
      before = here;
    }
  }

  /// The point at the fraction t of the curve's length.
  Oklab at(double t) const {
    const double wanted = std::clamp(t, 0.0, 1.0) * length_.back();
    const auto upper = std::lower_bound(length_.begin() + 1, length_.end() - 1, wanted);
    const auto k = upper - length_.begin();
    const double part = (wanted - length_[k - 1]) / (length_[k] - length_[k - 1]);
    return bezier((static_cast<double>(k - 1) + part) / kSteps);
  }

 private:
  static constexpr int kSteps = 512;
  Oklab bezier(double s) const {
    return {mixed(from_.L, middle_.L, to_.L, s), mixed(from_.a, middle_.a, to_.a, s),
            mixed(from_.b, middle_.b, to_.b, s)};
  }
  Oklab from_, middle_, to_;
  std::array<double, kSteps + 1> length_{};
};

double encoded(double linear) {
  return linear <= 0.0031308 ? 12.92 * linear : 1.055 * std::pow(linear, 1 / 2.4) - 0.055;
}

double decoded(double value) {
  return value <= 0.04045 ? value / 12.92 : std::pow((value + 0.055) / 1.055, 2.4);
}

double cube(double x) {
  return x * x * x;
}

}  // namespace

Oklab to_oklab(const Rgb& colour) {
  const double r = decoded(colour.red), g = decoded(colour.green), b = decoded(colour.blue);
  const double l = std::cbrt(0.4122214708 * r + 0.5363325363 * g + 0.0514459929 * b);
  const double m = std::cbrt(0.2119034982 * r + 0.6806995451 * g + 0.1073969566 * b);
  const double s = std::cbrt(0.0883024619 * r + 0.2817188376 * g + 0.6299787005 * b);
  return {0.2104542553 * l + 0.7936177850 * m - 0.0040720468 * s,
          1.9779984951 * l - 2.4285922050 * m + 0.4505937099 * s,
          0.0259040371 * l + 0.7827717662 * m - 0.8086757660 * s};
}

Rgb to_rgb(const Oklab& colour) {
  const double l = cube(colour.L + 0.3963377774 * colour.a + 0.2158037573 * colour.b);
  const double m = cube(colour.L - 0.1055613458 * colour.a - 0.0638541728 * colour.b);
  const double s = cube(colour.L - 0.0894841775 * colour.a - 1.2914855480 * colour.b);
  const auto channel = [](double linear) { return encoded(std::clamp(linear, 0.0, 1.0)); };
  return {channel(4.0767416621 * l - 3.3077115913 * m + 0.2309699292 * s),
          channel(-1.2684380046 * l + 2.6097574011 * m - 0.3413193965 * s),
          channel(-0.0041960863 * l - 0.7034186147 * m + 1.7076147010 * s)};
}

Rgb amplitude_colour(double t) {
  static const Curve curve({0.95, 0.002, 0.012}, {0.80, 0.10, 0.20}, {0.32, 0.11, -0.08});
  return to_rgb(curve.at(t));
}

Rgb balance_colour(double t) {
  // The two branches have slightly different speeds; both take the mean lightness, so that +t and
  // -t differ in hue and chroma only.
  static const Curve below({0.965, 0, 0}, {0.75, -0.05, -0.10}, {0.40, -0.03, -0.13});
  static const Curve above({0.965, 0, 0}, {0.75, 0.06, 0.13}, {0.40, 0.075, 0.075});
  const double size = std::min(std::abs(t), 1.0);
  Oklab colour = t < 0 ? below.at(size) : above.at(size);
  colour.L = (below.at(size).L + above.at(size).L) / 2;
  return to_rgb(colour);
}

}  // namespace headwater
