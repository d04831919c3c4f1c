# SPDX-License-Identifier: GPL-3.0-or-later
# Every C++ file is as clang-format leaves it (.clang-format; Debian 12's version 14).
include("${CMAKE_CURRENT_LIST_DIR}/project_files.cmake")
project_files(files *.hpp *.cpp)
execute_process(COMMAND "${CLANG_FORMAT}" --dry-run --Werror --style=file ${files}
  WORKING_DIRECTORY "${ROOT}" RESULT_VARIABLE result ERROR_VARIABLE findings)
if(NOT result EQUAL 0)
  string(REGEX MATCHALL "[^\n]+: error: [^\n]+" places "${findings}")
  list(TRANSFORM places REPLACE ":[0-9]+:[0-9]+: error:.*" "")
  list(REMOVE_DUPLICATES places)
  list(JOIN places "\n  " places)
  message(FATAL_ERROR "run clang-format -i on:\n  ${places}\n${findings}")
endif()
