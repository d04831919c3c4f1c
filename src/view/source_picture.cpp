// SPDX-License-Identifier: GPL-3.0-or-later
// Checks the input, loads the drawing module, writes what it returns. The module is looked for
// beside the library file itself, so that a built tree, an installed package and a moved one all
// work.
#include "view/module_entry.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/version.hpp>
#include <headwater/view/source_picture.hpp>

#include <dlfcn.h>
#include <fmt/core.h>

#include <cmath>
#include <cstdlib>
#include <mutex>
#include <utility>

namespace headwater {
namespace {

constexpr const char* kModuleFile = "headwater_view.so";
constexpr int kSmallestWidth = 800, kLargestWidth = 4000;  // legible text; memory of the renderer
constexpr Eigen::Index kFewestChannels = 4;  // below that a scalp map is a plane at best

class Problems {
 public:
  template <typename... Values>
  void add(fmt::format_string<Values...> text, Values&&... values) {
    text_ += "\n  - " + fmt::format(text, std::forward<Values>(values)...);
  }
  void add_if_not_finite(const char* name, const Eigen::Ref<const Eigen::MatrixXd>& values) {
    for (Eigen::Index column = 0; column < values.cols(); ++column)
      if (!values.col(column).allFinite())
        return add("{}: column {} holds a value that is not finite", name, column + 1);
  }
  void raise() const {
    if (!text_.empty()) throw ExperimentError("The picture cannot be drawn:" + text_);
  }

 private:
  std::string text_;
};

void check_map(const SourcePicture& p, Problems& problems) {
  if (p.points_mni_mm.cols() == 0) problems.add("there are no source points");
  if (p.points_mni_mm.cols() != p.values.size())
    problems.add("{} source points but {} values: one value for each point is needed",
                 p.points_mni_mm.cols(), p.values.size());
  problems.add_if_not_finite("source points", p.points_mni_mm);
  problems.add_if_not_finite("source values", p.values.transpose());
  for (Eigen::Index i = 0; i < p.values.size(); ++i)
    if (p.values(i) < 0) {
      problems.add("source value {} is {}: amplitudes cannot be negative", i + 1, p.values(i));
      break;
    }
  if (!(p.spacing_mm >= 1 && p.spacing_mm <= 30))
    problems.add("spacing of {} mm: 1 to 30 mm is expected", p.spacing_mm);
  for (const PictureMark& mark : p.marks)
    if (!mark.mni_mm.allFinite() || mark.mni_mm.norm() > 150)
      problems.add("mark '{}' is not in the head: MNI coordinates in mm are expected", mark.label);
}

void check_scalp(const SourcePicture& p, Problems& problems) {
  const auto channels = static_cast<Eigen::Index>(p.channels.size());
  if (p.directions.cols() != channels || p.scalp_uV.size() != channels)
    return problems.add("{} channels, {} electrode directions, {} scalp values: they must agree",
                        channels, p.directions.cols(), p.scalp_uV.size());
  if (channels > 0 && channels < kFewestChannels)
    problems.add("{} channels: a scalp map needs {} or more (or none, to leave it out)", channels,
                 kFewestChannels);
  problems.add_if_not_finite("scalp values", p.scalp_uV.transpose());
  for (Eigen::Index i = 0; i < channels; ++i) {
    const double length = p.directions.col(i).norm();
    if (!(length > 0) || !std::isfinite(length)) {
      problems.add("channel {}: its direction has no length", p.channels[i]);
      continue;
    }
    for (Eigen::Index j = 0; j < i; ++j)  // 1e-3 rad: 0.1 mm on the head
      if ((p.directions.col(i) / length - p.directions.col(j).normalized()).norm() < 1e-3)
        problems.add("channels {} and {} lie at the same place", p.channels[j], p.channels[i]);
  }
}

void check(const SourcePicture& picture) {
  Problems problems;
  check_map(picture, problems);
  check_scalp(picture, problems);
  if (picture.width_px < kSmallestWidth || picture.width_px > kLargestWidth)
    problems.add("width of {} px: {} to {} px are possible", picture.width_px, kSmallestWidth,
                 kLargestWidth);
  problems.raise();
}

std::filesystem::path library_folder() {
  Dl_info info{};
  if (dladdr(reinterpret_cast<const void*>(&write_source_picture), &info) == 0 || !info.dli_fname)
    throw ResourceError(
        "The library's own file cannot be found, so neither can the drawing module.");
  return std::filesystem::absolute(info.dli_fname).parent_path();
}

std::filesystem::path module_path() {
  if (const char* given = std::getenv("HEADWATER_VIEW_MODULE"); given && *given) return given;
  const auto folder = library_folder();
  std::error_code ignored;
  for (const auto& candidate : {folder / kModuleFile, folder / "headwater" / kModuleFile})
    if (std::filesystem::exists(candidate, ignored)) return candidate;
  throw ResourceError(fmt::format(
      "Pictures need the drawing module {0}, which is neither in {1} nor in {1}/headwater. "
      "Build or install it (it needs the packages libvtk9-dev, libglew-dev and "
      "libegl-dev), or name it in HEADWATER_VIEW_MODULE.",
      kModuleFile, folder.string()));
}

/// The module is never closed: VTK does not survive being unloaded, and opening it again is cheap.
DrawingEntry* drawing_entry() {
  const auto path = module_path();
  void* module = dlopen(path.c_str(), RTLD_NOW | RTLD_LOCAL);
  if (!module)
    throw ResourceError(
        fmt::format("The drawing module cannot be loaded: {}. Install the packages "
                    "libvtk9.1, libglew2.2 and libegl1.",
                    dlerror()));
  auto* entry = reinterpret_cast<DrawingEntry*>(dlsym(module, kDrawingEntry));
  if (!entry)
    throw ResourceError(fmt::format("{} is not the drawing module of Headwater: it has no {}.",
                                    path.string(), kDrawingEntry));
  return entry;
}

}  // namespace

void write_source_picture(const std::filesystem::path& path, const SourcePicture& picture) {
  check(picture);
  DrawingTask task{version(), &picture, {}, {}};
  {
    static std::mutex one_at_a_time;  // VTK's global state and the shared EGL display
    const std::lock_guard lock(one_at_a_time);
    drawing_entry()(&task);
  }
  if (!task.problem.empty()) throw ResourceError(task.problem);
  write_file(path, task.png);
}

}  // namespace headwater
