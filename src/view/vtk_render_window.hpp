// SPDX-License-Identifier: GPL-3.0-or-later
// A VTK render window that owns a surfaceless EGL context: it needs no display. Debian's VTK is
// built for X11 only, and its ordinary off-screen window ends the process where there is no X
// server; the generic OpenGL window leaves the context to its owner, which is what this class is.
#pragma once
#include <vtkGenericOpenGLRenderWindow.h>

#include <string>

namespace headwater {

class EglWindow : public vtkGenericOpenGLRenderWindow {
 public:
  static EglWindow* New();
  vtkTypeMacro(EglWindow, vtkGenericOpenGLRenderWindow) EglWindow(const EglWindow&) = delete;
  EglWindow& operator=(const EglWindow&) = delete;

  /// Creates the context. Empty, or why there is none.
  std::string open();

  void Initialize() override;
  void MakeCurrent() override;
  bool IsCurrent() override;
  int SupportsOpenGL() override { return 1; }
  vtkTypeBool IsDirect() override { return 0; }
  void Frame() override {}  // nothing to present
  void ReleaseCurrent();
  void OpenGLInitContext() override;

 protected:
  EglWindow();
  ~EglWindow() override;

 private:
  void* context_ = nullptr;  // EGLContext
};

}  // namespace headwater
