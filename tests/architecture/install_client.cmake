# SPDX-License-Identifier: GPL-3.0-or-later
# Installs to a fresh prefix, moves the prefix (packages are moved), then builds and runs a client that
# finds the library with find_package, as another project would.
cmake_minimum_required(VERSION 3.25)

function(run)
  execute_process(COMMAND ${ARGN} RESULT_VARIABLE result OUTPUT_VARIABLE output ERROR_VARIABLE errors)
  if(NOT result EQUAL 0)
    list(JOIN ARGN " " command)
    message(FATAL_ERROR "${command}\nended with ${result}\n${output}\n${errors}")
  endif()
  set(output "${output}" PARENT_SCOPE)
endfunction()

file(REMOVE_RECURSE "${WORK}")
run(${CMAKE_COMMAND} --install "${BUILD}" --prefix "${WORK}/first")
file(RENAME "${WORK}/first" "${WORK}/prefix")

run("${WORK}/prefix/${BINDIR}/headwater" --version)
if(NOT output MATCHES "headwater ${VERSION}")
  message(FATAL_ERROR "the installed program says '${output}' for its version")
endif()

# The flags of the environment may carry -march; the client is built for any x86-64.
set(ENV{CXXFLAGS} "")
run(${CMAKE_COMMAND} -G Ninja -S "${CLIENT}" -B "${WORK}/client" "-DCMAKE_CXX_COMPILER=${COMPILER}"
    "-DCMAKE_PREFIX_PATH=${WORK}/prefix" -DHEADWATER_EXPECTED=${VERSION})
run(${CMAKE_COMMAND} --build "${WORK}/client")
run("${WORK}/client/client")
message(STATUS "${output}")
