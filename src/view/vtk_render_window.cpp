// SPDX-License-Identifier: GPL-3.0-or-later
#include "view/vtk_render_window.hpp"

#include <GL/glew.h>  // before every other OpenGL header

#define EGL_NO_X11
#include <EGL/egl.h>
#include <EGL/eglext.h>
#include <vtkObjectFactory.h>
#include <vtkOpenGLState.h>

#include <array>
#include <cstdlib>
#include <mutex>
#include <string_view>

namespace headwater {
namespace {

bool offers(const char* extensions, std::string_view name) {
  return extensions && std::string_view(extensions).find(name) != std::string_view::npos;
}

/// Mesa's software renderer by preference, so that a picture has the same pixels with and without a
/// graphics card; else the first device that opens.
EGLDisplay new_display() {
  setenv("LIBGL_ALWAYS_SOFTWARE", "1", 0);  // the user's own setting wins
  setenv("EGL_LOG_LEVEL", "fatal", 0);      // a library does not print
  const char* extensions = eglQueryString(EGL_NO_DISPLAY, EGL_EXTENSIONS);
  const auto platform_display = reinterpret_cast<PFNEGLGETPLATFORMDISPLAYEXTPROC>(
      eglGetProcAddress("eglGetPlatformDisplayEXT"));
  if (!extensions || !platform_display) return EGL_NO_DISPLAY;
  const auto opened = [&](EGLenum platform, void* device) {
    EGLint major = 0, minor = 0;
    const EGLDisplay display = platform_display(platform, device, nullptr);
    return display != EGL_NO_DISPLAY && eglInitialize(display, &major, &minor) ? display
                                                                               : EGL_NO_DISPLAY;
  };
  if (offers(extensions, "EGL_MESA_platform_surfaceless"))
    if (const auto display = opened(EGL_PLATFORM_SURFACELESS_MESA, EGL_DEFAULT_DISPLAY))
      return display;
  const auto query_devices =
      reinterpret_cast<PFNEGLQUERYDEVICESEXTPROC>(eglGetProcAddress("eglQueryDevicesEXT"));
  std::array<EGLDeviceEXT, 16> devices{};
  EGLint count = 0;
  if (query_devices && offers(extensions, "EGL_EXT_platform_device") &&
      query_devices(static_cast<EGLint>(devices.size()), devices.data(), &count))
    for (EGLint i = 0; i < count; ++i)
      if (const auto display = opened(EGL_PLATFORM_DEVICE_EXT, devices[i])) return display;
  return EGL_NO_DISPLAY;
}

/// One display per process: EGL returns the same one each time and does not count its users, so it
/// is initialised once and never ended.
EGLDisplay shared_display() {
  static const EGLDisplay display = new_display();
  return display;
}

}  // namespace

vtkStandardNewMacro(EglWindow)

    EglWindow::EglWindow() {
  SetOffScreenRendering(1);
  SetShowWindow(false);
  SetUseOffScreenBuffers(true);
  SetFrameBlitModeToNoBlit();  // a surfaceless context has no framebuffer of its own
  SetReadyForRendering(false);
  SetMapped(1);
  SetIsDirect(0);
  SetSupportsOpenGL(1);
}

EglWindow::~EglWindow() {
  if (!context_) return;
  MakeCurrent();
  Finalize();
  ReleaseCurrent();
  eglDestroyContext(shared_display(), context_);
  context_ = nullptr;
}

std::string EglWindow::open() {
  if (context_) return {};
  const EGLDisplay display = shared_display();
  if (display == EGL_NO_DISPLAY) return "EGL offers no display";
  if (!eglBindAPI(EGL_OPENGL_API)) return "EGL has no desktop OpenGL";
  const EGLint wanted[] = {EGL_SURFACE_TYPE,
                           EGL_PBUFFER_BIT,
                           EGL_RENDERABLE_TYPE,
                           EGL_OPENGL_BIT,
                           EGL_RED_SIZE,
                           8,
                           EGL_GREEN_SIZE,
                           8,
                           EGL_BLUE_SIZE,
                           8,
                           EGL_NONE};
  EGLConfig config = nullptr;
  EGLint count = 0;
  if (!eglChooseConfig(display, wanted, &config, 1, &count) || count < 1)
    return "EGL has no configuration with desktop OpenGL";
  const EGLint version[] = {EGL_CONTEXT_MAJOR_VERSION,
                            3,
                            EGL_CONTEXT_MINOR_VERSION,
                            2,
                            EGL_CONTEXT_OPENGL_PROFILE_MASK,
                            EGL_CONTEXT_OPENGL_CORE_PROFILE_BIT,
                            EGL_NONE};
  context_ = eglCreateContext(display, config, EGL_NO_CONTEXT, version);
  if (context_ == EGL_NO_CONTEXT) return "there is no OpenGL 3.2 core context";
  MakeCurrent();
  if (!IsCurrent()) return "the OpenGL context cannot be made current";
  SetReadyForRendering(true);
  OpenGLInit();
  if (!Initialized) return "the functions of OpenGL cannot be loaded";
  GetState()->vtkglDepthFunc(GL_LEQUAL);  // flat shapes share one depth: the later one covers
  return {};
}

void EglWindow::Initialize() {
  open();
}

void EglWindow::MakeCurrent() {
  if (!context_ || IsCurrent()) return;
  eglBindAPI(EGL_OPENGL_API);  // a state of the thread
  eglMakeCurrent(shared_display(), EGL_NO_SURFACE, EGL_NO_SURFACE, context_);
}

bool EglWindow::IsCurrent() {
  return context_ && eglGetCurrentContext() == context_;
}

void EglWindow::ReleaseCurrent() {
  eglMakeCurrent(shared_display(), EGL_NO_SURFACE, EGL_NO_SURFACE, EGL_NO_CONTEXT);
}

void EglWindow::OpenGLInitContext() {
  if (!Initialized && context_) {
    // GLEW loads every function of OpenGL first and only then asks for an X display: that last
    // failure is harmless here.
    glewExperimental = GL_TRUE;
    const GLenum outcome = glewInit();
    if (outcome == GLEW_OK || outcome == GLEW_ERROR_NO_GLX_DISPLAY) {
      GlewInitValid = true;
      Initialized = true;
    }
  }
  Superclass::OpenGLInitContext();
}

}  // namespace headwater
