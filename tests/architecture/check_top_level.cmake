# SPDX-License-Identifier: GPL-3.0-or-later
# The top level holds these entries and what .gitignore names there, nothing else.
include("${CMAKE_CURRENT_LIST_DIR}/project_files.cmake")
set(allowed CMakeLists.txt CMakePresets.json README.md DEVELOPERS.md LICENSE src include tests
    templates examples .ci .clang-format .clang-tidy .git .gitignore)
file(STRINGS "${ROOT}/.gitignore" ignored)
foreach(pattern IN LISTS ignored)
  string(REGEX REPLACE "^/|/$" "" pattern "${pattern}")
  file(GLOB matches RELATIVE "${ROOT}" "${ROOT}/${pattern}")
  list(APPEND allowed ${matches})
endforeach()
file(GLOB entries RELATIVE "${ROOT}" "${ROOT}/*" "${ROOT}/.*")
foreach(entry IN LISTS entries)
  if(NOT entry IN_LIST allowed)
    message(SEND_ERROR "${entry}: has no place at the top level")
  endif()
endforeach()
