# SPDX-License-Identifier: GPL-3.0-or-later
# What `cmake --install` lays down: program, library, public headers, and the package files through which
# other projects find Headwater::headwater. Templates are inside the library; the drawing module installs
# itself (src/view/view_module.cmake).
include(CMakePackageConfigHelpers)
set(headwater_package_folder ${CMAKE_INSTALL_LIBDIR}/cmake/Headwater)

install(TARGETS headwater EXPORT HeadwaterTargets LIBRARY DESTINATION ${CMAKE_INSTALL_LIBDIR})
install(TARGETS headwater_program RUNTIME DESTINATION ${CMAKE_INSTALL_BINDIR})
install(DIRECTORY ${CMAKE_SOURCE_DIR}/include/headwater DESTINATION ${CMAKE_INSTALL_INCLUDEDIR}
        FILES_MATCHING PATTERN "*.hpp")

# The targets file carries the EIGEN_MAX_*ALIGN_BYTES to clients: they may be built without AVX, and
# still allocate matrices as the library does.
install(EXPORT HeadwaterTargets NAMESPACE Headwater:: DESTINATION ${headwater_package_folder})
configure_package_config_file(${CMAKE_SOURCE_DIR}/src/HeadwaterConfig.cmake.in
  ${CMAKE_BINARY_DIR}/HeadwaterConfig.cmake INSTALL_DESTINATION ${headwater_package_folder})
# Before 1.0 each minor version may change the interface.
write_basic_package_version_file(${CMAKE_BINARY_DIR}/HeadwaterConfigVersion.cmake
  VERSION ${PROJECT_VERSION} COMPATIBILITY SameMinorVersion)
install(FILES ${CMAKE_BINARY_DIR}/HeadwaterConfig.cmake
              ${CMAKE_BINARY_DIR}/HeadwaterConfigVersion.cmake
        DESTINATION ${headwater_package_folder})
