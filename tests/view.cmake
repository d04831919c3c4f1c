# SPDX-License-Identifier: GPL-3.0-or-later
# Pictures are drawn and read back with VTK's own reader: a program apart, so that the other test
# programs do not link VTK.
if(TARGET headwater_view)
  find_package(VTK 9.1 REQUIRED COMPONENTS CommonCore CommonDataModel IOImage)
  file(GLOB sources CONFIGURE_DEPENDS ${CMAKE_CURRENT_SOURCE_DIR}/picture/*.cpp)
  add_executable(test_view ${sources})
  target_include_directories(test_view PRIVATE ${CMAKE_CURRENT_SOURCE_DIR})
  target_link_libraries(test_view PRIVATE headwater_reference headwater headwater_options fmt::fmt
                        VTK::CommonCore VTK::CommonDataModel VTK::IOImage GTest::gtest_main)
  add_dependencies(test_view headwater_view)
  gtest_discover_tests(test_view PROPERTIES LABELS picture DISCOVERY_TIMEOUT 60)
endif()
