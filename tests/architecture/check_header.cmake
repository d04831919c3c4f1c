# SPDX-License-Identifier: GPL-3.0-or-later
# A public header compiles as the first include, and twice:
# cmake -DCOMPILER=... -DINCLUDE=<include folder> -DEIGEN=<folder> -DHEADER=<name> -P check_header.cmake
execute_process(COMMAND "${COMPILER}" -std=c++20 -fsyntax-only -Wall -Wextra -Wpedantic -Wshadow -Werror
  "-I${INCLUDE}" -isystem "${EIGEN}" -include "${HEADER}" -include "${HEADER}" -x c++ /dev/null
  RESULT_VARIABLE result ERROR_VARIABLE errors)
if(NOT result EQUAL 0)
  message(FATAL_ERROR "${HEADER} does not compile alone:\n${errors}")
endif()
