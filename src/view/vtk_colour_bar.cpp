// SPDX-License-Identifier: GPL-3.0-or-later
#include "view/vtk_colour_bar.hpp"

namespace headwater {
namespace {
constexpr Rgb kInk{0.1, 0.1, 0.1};
constexpr int kSteps = 256;
}  // namespace

double colour_bar_height(const TextStyle& style) {
  return 4.1 * style.size_px;
}

void draw_colour_bar(Canvas& canvas, const ColourBar& bar, double x, double y, double width,
                     const TextStyle& style) {
  const double size = style.size_px, top = y + 1.4 * size, height = size, rim = size / 18;
  canvas.text({x + width / 2, y + 0.55 * size}, bar.heading, style, Align::centre);
  canvas.rectangle(x - rim, top - rim, width + 2 * rim, height + 2 * rim, kInk);
  Canvas::Points corners;
  std::vector<Rgb> colours;
  std::vector<Eigen::Vector3i> triangles;
  for (int k = 0; k <= kSteps; ++k) {
    const double t = static_cast<double>(k) / kSteps;
    for (const double edge : {top, top + height}) {
      corners.emplace_back(x + t * width, edge);
      colours.push_back(bar.colour(bar.both_signs ? 2 * t - 1 : t));
    }
    if (k < kSteps) {
      triangles.emplace_back(2 * k, 2 * k + 1, 2 * k + 2);
      triangles.emplace_back(2 * k + 1, 2 * k + 3, 2 * k + 2);
    }
  }
  canvas.shaded(corners, triangles, colours);
  const auto tick = [&](double value) {
    const double share = value / bar.scale.top;
    const double at = x + width * (bar.both_signs ? (share + 1) / 2 : share);
    const double end = top + height + 0.3 * size;
    canvas.segments({{at, top + height}, {at, end}}, 1.5 * rim, kInk);
    const std::string sign = value < 0 ? "\u2212" : bar.both_signs && value > 0 ? "+" : "";
    canvas.text({at, end + 0.65 * size}, sign + bar.scale.text(std::abs(value)), style,
                Align::centre);
  };
  for (const double value : bar.scale.ticks()) {
    tick(value);
    if (bar.both_signs && value > 0) tick(-value);
  }
}

}  // namespace headwater
