# SPDX-License-Identifier: GPL-3.0-or-later
# The drawing module: the only part that knows VTK and EGL. The library loads it on first use
# (source_picture.cpp), so it is no link dependency of anything.
find_package(VTK 9.1 REQUIRED COMPONENTS
  CommonCore CommonDataModel CommonExecutionModel FiltersCore IOImage
  RenderingCore RenderingFreeType RenderingOpenGL2)
find_package(GLEW REQUIRED)
find_package(OpenGL REQUIRED COMPONENTS EGL)

file(GLOB view_module_sources CONFIGURE_DEPENDS ${CMAKE_SOURCE_DIR}/src/view/vtk_*.cpp)
add_library(headwater_view MODULE ${view_module_sources})
set_target_properties(headwater_view PROPERTIES PREFIX ""
  INSTALL_RPATH "$ORIGIN/..;$ORIGIN")
target_include_directories(headwater_view PRIVATE ${CMAKE_SOURCE_DIR}/src)
target_link_libraries(headwater_view PRIVATE headwater headwater_options fmt::fmt
  ${VTK_LIBRARIES} GLEW::GLEW OpenGL::EGL)
vtk_module_autoinit(TARGETS headwater_view MODULES ${VTK_LIBRARIES})
install(TARGETS headwater_view LIBRARY DESTINATION ${CMAKE_INSTALL_LIBDIR}/headwater)
