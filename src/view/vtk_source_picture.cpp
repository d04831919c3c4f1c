// SPDX-License-Identifier: GPL-3.0-or-later
// Composes the picture, top to bottom: title; on the left four views of the brain and their colour
// bar, on the right the scalp map, its bar and the list of marks; notes across the whole width. The
// height follows from what there is to write. All lengths are parts of the width.
#include "view/module_entry.hpp"
#include "view/vtk_brain_scene.hpp"
#include "view/vtk_canvas.hpp"
#include "view/vtk_colour_bar.hpp"
#include "view/vtk_render_window.hpp"
#include "view/vtk_scalp_scene.hpp"

#include <headwater/base/error.hpp>
#include <headwater/base/version.hpp>

#include <fmt/core.h>
#include <vtkImageData.h>
#include <vtkNew.h>
#include <vtkObjectFactory.h>
#include <vtkOutputWindow.h>
#include <vtkPNGWriter.h>
#include <vtkRendererCollection.h>
#include <vtkStringOutputWindow.h>
#include <vtkUnsignedCharArray.h>
#include <vtkWindowToImageFilter.h>

#include <algorithm>
#include <cmath>
#include <exception>

namespace headwater {
namespace {

constexpr Rgb kInk{0.1, 0.1, 0.1}, kGrey{0.33, 0.33, 0.33};
constexpr int kHalvings = 6;          // 1.4 mm between vertices
constexpr double kLineHeight = 1.38;  // of the font size
constexpr double kCaptionGap = 0.25;  // between captions, of the text's size
constexpr double kRuler_mm = 50;

/// Quantity and unit in the trade's manner: "scalp potential (uV)".
std::string with_unit(const std::string& name, const std::string& unit) {
  return unit.empty() ? name : fmt::format("{} ({})", name, unit);
}

/// What the module itself has to say about this picture.
std::vector<std::string> own_notes(const SourcePicture& p) {
  std::vector<std::string> notes;
  notes.push_back(
      fmt::format("Colour: the largest value, as a local mean (Gaussian, SD {:.3g} mm), down to "
                  "{:.0f} mm below "
                  "the surface; deeper sources are not painted.",
                  0.75 * p.spacing_mm, kShownDepth_mm));
  if (!p.marks.empty())
    notes.push_back(
        fmt::format("Marks are seen through the brain: filled, at most {:.0f} mm below the surface "
                    "seen; hollow, "
                    "deeper or behind; diamonds, mirrored pair.",
                    kShownDepth_mm));
  Eigen::Index largest = 0;
  const double value = p.values.maxCoeff(&largest);
  const double depth = depth_below_hull_mm(p.points_mni_mm.col(largest));
  if (value == 0)
    notes.push_back("The map is zero everywhere.");
  else if (depth > kShownDepth_mm)
    notes.push_back(fmt::format(
        "The map's largest value lies {:.0f} mm deep, below what the surface can show.", depth));
  return notes;
}

std::string full_caption(const PictureMark& mark) {
  const double depth = depth_below_hull_mm(mark.mni_mm);
  std::string text = mark.caption.empty() ? mark.label : mark.caption;
  if (depth > kShownDepth_mm) text += fmt::format(" ({:.0f} mm deep)", depth);
  // A unit stays on the line of its number.
  for (const std::string unit : {" mm", " ms"})
    for (auto at = text.find(unit); at != std::string::npos; at = text.find(unit, at))
      text.replace(at, 1, "\u00a0");
  return text;
}

struct Styles {
  explicit Styles(double w)
      : title{w / 44, true, kInk},
        subtitle{w / 58, false, kGrey},
        text{w / 56, false, kInk},
        heading{w / 56, true, kInk},
        caption{w / 63, false, kInk},
        note{w / 72, false, kGrey} {}
  TextStyle title, subtitle, text, heading, caption, note;
};

/// Lines of one style, already broken.
struct Block {
  std::vector<std::string> lines;
  TextStyle style;
  double height() const { return static_cast<double>(lines.size()) * kLineHeight * style.size_px; }
};

void draw_block(Canvas& canvas, const Block& block, double x, double y) {
  for (std::size_t k = 0; k < block.lines.size(); ++k)
    canvas.text({x, y + (static_cast<double>(k) + 0.5) * kLineHeight * block.style.size_px},
                block.lines[k], block.style);
}

/// Everything whose size must be known before the height of the picture is.
struct Layout {
  double width, margin, left_width, right_x, right_width, px_per_mm;
  Block title, subtitle;
  std::vector<Block> captions, notes;
  std::array<BrainPanel, 4> panels;
  double body_y, second_row_y, bar_y, scalp_y, scalp_width, captions_y, captions_end, notes_y,
      height;
};

class Composer {
 public:
  Composer(const SourcePicture& picture, const Fonts& fonts)
      : p_(picture),
        fonts_(fonts),
        styles_(picture.width_px),
        scale_(tick_scale(picture.values.maxCoeff(), 4)),
        scene_(make_scene(picture, scale_)) {
    measure();
  }

  int width_px() const { return p_.width_px; }
  int height_px() const { return static_cast<int>(std::ceil(at_.height)); }

  void draw(EglWindow* window) {
    Canvas canvas(fonts_, height_px());
    vtkNew<vtkRenderer> paper;
    paper->SetBackground(1, 1, 1);
    window->SetNumberOfLayers(2);
    window->AddRenderer(paper);
    for (std::size_t k = 0; k < brain_sides().size(); ++k)
      window->AddRenderer(
          scene_.view(brain_sides()[k], at_.panels[k], Eigen::Vector2d(width_px(), height_px())));
    canvas.renderer()->SetLayer(1);
    window->AddRenderer(canvas.renderer());
    draw_block(canvas, at_.title, at_.margin, at_.margin);
    draw_block(canvas, at_.subtitle, at_.margin, at_.margin + at_.title.height());
    for (std::size_t k = 0; k < brain_sides().size(); ++k) draw_side(canvas, k);
    draw_ruler(canvas);
    draw_bars(canvas);
    draw_lists(canvas);
    window->Render();
  }

 private:
  static BrainScene make_scene(const SourcePicture& p, const TickScale& scale) {
    SurfaceMesh mesh = drawn_brain(kHalvings);
    const auto painted = painted_values(mesh, p.points_mni_mm, p.values, p.spacing_mm);
    return BrainScene(std::move(mesh), painted, scale);
  }

  bool has_scalp() const { return !p_.channels.empty(); }
  double text_px() const { return styles_.text.size_px; }

  void measure() {
    const double w = p_.width_px, margin = w / 44;
    at_.width = w;
    at_.margin = margin;
    at_.left_width = 0.575 * w;
    at_.right_x = margin + at_.left_width + 1.5 * margin;
    at_.right_width = w - margin - at_.right_x;
    at_.title = {fonts_.wrapped(p_.title, styles_.title, w - 2 * margin), styles_.title};
    at_.subtitle = {fonts_.wrapped(p_.subtitle, styles_.subtitle, w - 2 * margin),
                    styles_.subtitle};
    at_.body_y = margin + at_.title.height() + at_.subtitle.height() + margin;
    measure_brains();
    measure_right_column();
    at_.notes_y = std::max(at_.bar_y + colour_bar_height(styles_.text), at_.captions_end) + margin;
    at_.height = at_.notes_y;
    for (const auto& texts : {p_.notes, own_notes(p_)})
      for (const auto& note : texts) {
        at_.notes.push_back({fonts_.wrapped(note, styles_.note, w - 2 * margin), styles_.note});
        at_.height += at_.notes.back().height();
      }
    at_.height += margin;
  }

  /// Two rows of two; one scale for all four.
  void measure_brains() {
    const auto& sides = brain_sides();
    const double column = at_.left_width / 2, letter = 1.5 * text_px(), gap = text_px();
    at_.px_per_mm = (column - gap - 2 * letter) / scene_.extent_mm(sides[kLeft]).x();
    double y = at_.body_y;
    for (const std::size_t row : {std::size_t{0}, std::size_t{2}}) {
      (row == 0 ? at_.body_y : at_.second_row_y) = y;
      double tallest = 0;
      for (const std::size_t k : {row, row + 1})
        tallest = std::max(tallest, at_.px_per_mm * scene_.extent_mm(sides[k]).y() +
                                        2 * (*sides[k].top_letter ? letter : 0));
      const double middle = y + kLineHeight * text_px() + tallest / 2;
      for (const std::size_t k : {row, row + 1}) {
        const Eigen::Vector2d size = (at_.px_per_mm * scene_.extent_mm(sides[k])).array() + 4;
        at_.panels[k] = {
            {at_.margin + (k == row ? 0.5 : 1.5) * column, middle}, size, at_.px_per_mm};
      }
      y = middle + tallest / 2 + gap;
    }
    at_.bar_y = y;
  }

  void measure_right_column() {
    double y = at_.body_y;
    if (has_scalp()) {
      at_.scalp_y = y + kLineHeight * text_px();
      at_.scalp_width = 0.82 * at_.right_width;
      y = at_.scalp_y + at_.scalp_width + text_px() + colour_bar_height(styles_.text);
    }
    y += text_px();
    at_.captions_y = at_.captions_end = y;
    if (p_.marks.empty()) return;
    y += kLineHeight * text_px();
    for (const auto& mark : p_.marks) {
      at_.captions.push_back(
          {fonts_.wrapped(full_caption(mark), styles_.text, at_.right_width - 1.4 * text_px()),
           styles_.caption});
      y += at_.captions.back().height() + kCaptionGap * text_px();
    }
    at_.captions_end = y;
  }

  void draw_side(Canvas& canvas, std::size_t k) {
    const BrainSide& side = brain_sides()[k];
    const BrainPanel& panel = at_.panels[k];
    const double row_y = k < kTop ? at_.body_y : at_.second_row_y;
    canvas.text({panel.centre.x(), row_y + 0.5 * kLineHeight * text_px()}, side.name,
                styles_.heading, Align::centre);
    const double across = panel.size.x() / 2 + 0.75 * text_px();
    const double along = panel.size.y() / 2 + 0.65 * text_px();
    const auto letter = [&](double x, double y, const char* text) {
      canvas.text(panel.centre + Eigen::Vector2d(x, y), text, styles_.text, Align::centre);
    };
    letter(-across, 0, side.left_letter);
    letter(across, 0, side.right_letter);
    letter(0, -along, side.top_letter);
    letter(0, along, side.bottom_letter);
    scene_.draw_marks(canvas, side, panel, p_.marks, styles_.heading);
  }

  /// A length to judge distances by, under the view from the front.
  void draw_ruler(Canvas& canvas) {
    const BrainPanel& front = at_.panels[kFront];
    const double half = kRuler_mm * at_.px_per_mm / 2, pen = text_px() / 12;
    const double x = front.centre.x(), y = at_.bar_y - 1.2 * text_px();
    canvas.segments({{x - half, y}, {x + half, y}}, pen, kInk);
    for (const double end : {x - half, x + half})
      canvas.segments({{end, y - 3 * pen}, {end, y + 3 * pen}}, pen, kInk);
    canvas.text({x, y - 0.75 * text_px()}, fmt::format("{:.0f} mm", kRuler_mm), styles_.text,
                Align::centre);
  }

  void draw_bars(Canvas& canvas) {
    const ColourBar bar{with_unit(p_.value_name, p_.unit), scale_, false, amplitude_colour};
    const double width = 0.7 * at_.left_width;
    draw_colour_bar(canvas, bar, at_.margin + (at_.left_width - width) / 2, at_.bar_y, width,
                    styles_.text);
    if (!has_scalp()) return;
    const double middle = at_.right_x + at_.right_width / 2;
    canvas.text({middle, at_.body_y + 0.5 * kLineHeight * text_px()}, "scalp, from above",
                styles_.heading, Align::centre);
    draw_scalp_map(canvas, p_, {middle, at_.scalp_y + at_.scalp_width / 2}, at_.scalp_width,
                   styles_.text);
    const TickScale scale = scalp_scale(p_);
    const ColourBar scalp{
        fmt::format("potential (\u00b5V), lines every {:.3g} \u00b5V", scale.step / 2), scale, true,
        balance_colour};
    draw_colour_bar(canvas, scalp, middle - at_.scalp_width / 2,
                    at_.scalp_y + at_.scalp_width + text_px(), at_.scalp_width, styles_.text);
  }

  void draw_lists(Canvas& canvas) {
    double y = at_.captions_y;
    if (!p_.marks.empty())
      canvas.text({at_.right_x, y + 0.5 * kLineHeight * text_px()}, "marks", styles_.heading);
    y += kLineHeight * text_px();
    for (std::size_t k = 0; k < at_.captions.size(); ++k) {
      const PictureMark& mark = p_.marks[k];
      draw_mark(canvas,
                {at_.right_x + 0.5 * text_px(), y + 0.5 * kLineHeight * styles_.caption.size_px},
                0.33 * text_px(), mark.pair, depth_below_hull_mm(mark.mni_mm) <= kShownDepth_mm);
      draw_block(canvas, at_.captions[k], at_.right_x + 1.4 * text_px(), y);
      y += at_.captions[k].height() + kCaptionGap * text_px();
    }
    y = at_.notes_y;
    for (const Block& note : at_.notes) {
      draw_block(canvas, note, at_.margin, y);
      y += note.height();
    }
  }

  const SourcePicture& p_;
  const Fonts& fonts_;
  Styles styles_;
  TickScale scale_;
  BrainScene scene_;
  Layout at_{};
};

/// The rendered pixels averaged to the picture's own size.
vtkSmartPointer<vtkImageData> shrunk(vtkImageData* large, int width, int height) {
  auto small = vtkSmartPointer<vtkImageData>::New();
  small->SetDimensions(width, height, 1);
  small->AllocateScalars(VTK_UNSIGNED_CHAR, 3);
  const auto* from = static_cast<const unsigned char*>(large->GetScalarPointer());
  auto* to = static_cast<unsigned char*>(small->GetScalarPointer());
  constexpr int cells = kOversampling * kOversampling;
  const std::ptrdiff_t stride = std::ptrdiff_t{3} * width * kOversampling;
  for (int y = 0; y < height; ++y)
    for (int x = 0; x < 3 * width; ++x) {
      int sum = cells / 2;
      for (int dy = 0; dy < kOversampling; ++dy)
        for (int dx = 0; dx < kOversampling; ++dx)
          sum += from[(y * kOversampling + dy) * stride + (x / 3 * kOversampling + dx) * 3 + x % 3];
      to[std::ptrdiff_t{3} * width * y + x] = static_cast<unsigned char>(sum / cells);
    }
  return small;
}

std::string render(const SourcePicture& picture) {
  const Fonts fonts;
  Composer composer(picture, fonts);
  vtkNew<EglWindow> window;
  if (const std::string why = window->open(); !why.empty())
    throw ResourceError("No renderer could be had: " + why +
                        ". Install the packages libegl1 and libegl-mesa0 (Mesa's software renderer "
                        "needs no graphics card and no display).");
  const int width = composer.width_px(), height = composer.height_px();
  window->SetDPI(72);  // a font size is in pixels
  window->SetMultiSamples(0);
  window->SetSize(width * kOversampling, height * kOversampling);
  composer.draw(window);
  vtkNew<vtkWindowToImageFilter> pixels;
  pixels->SetInput(window);
  pixels->SetInputBufferTypeToRGB();
  pixels->ReadFrontBufferOff();
  pixels->ShouldRerenderOff();
  pixels->Update();
  vtkNew<vtkPNGWriter> writer;
  writer->SetInputData(shrunk(pixels->GetOutput(), width, height));
  writer->WriteToMemoryOn();
  writer->Write();
  vtkUnsignedCharArray* bytes = writer->GetResult();
  return {reinterpret_cast<const char*>(bytes->GetPointer(0)),
          static_cast<std::size_t>(bytes->GetNumberOfValues())};
}

/// VTK's own messages are kept from the terminal while this lives.
class QuietVtk {
 public:
  QuietVtk() : before_(vtkOutputWindow::GetInstance()) { vtkOutputWindow::SetInstance(messages_); }
  ~QuietVtk() { vtkOutputWindow::SetInstance(before_); }
  QuietVtk(const QuietVtk&) = delete;
  QuietVtk& operator=(const QuietVtk&) = delete;
  std::string messages() { return messages_->GetOutput(); }

 private:
  vtkSmartPointer<vtkOutputWindow> before_;
  vtkNew<vtkStringOutputWindow> messages_;
};

}  // namespace
}  // namespace headwater

extern "C" void headwater_draw_source_picture(headwater::DrawingTask* task) {
  using namespace headwater;
  if (task->version != version()) {
    task->problem =
        "The drawing module and the library are of different versions. Install both anew.";
    return;
  }
  try {
    QuietVtk quiet;
    task->png = render(*task->picture);
    if (const std::string said = quiet.messages(); said.find("ERROR") != std::string::npos)
      task->problem = "The renderer failed: " + said;
  } catch (const std::exception& error) {
    task->problem = error.what();
  } catch (...) {
    task->problem = "The renderer failed for an unknown reason.";
  }
}
