// SPDX-License-Identifier: GPL-3.0-or-later
// The one door between the library and the drawing module that it loads on first use. No exception
// passes through it: trouble comes back as text.
#pragma once
#include <headwater/view/source_picture.hpp>

#include <string>

namespace headwater {

struct DrawingTask {
  std::string version;  ///< of the calling library; the module refuses another one's structs
  const SourcePicture* picture = nullptr;
  std::string png;      ///< result: the bytes of the file
  std::string problem;  ///< result: empty, or why there is no picture
};

inline constexpr const char* kDrawingEntry = "headwater_draw_source_picture";
using DrawingEntry = void(DrawingTask*);

}  // namespace headwater
