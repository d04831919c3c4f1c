# SPDX-License-Identifier: GPL-3.0-or-later
# Shared by the checks of this folder, each run as `cmake -DROOT=<source folder> -P check_<rule>.cmake`.
# A check reports every finding, then fails.
cmake_minimum_required(VERSION 3.25)

# project_files(<out> <glob>...): files of the project's folders, relative to ROOT.
function(project_files out)
  set(found "")
  foreach(folder src include tests templates examples .ci)
    foreach(glob IN LISTS ARGN)
      file(GLOB_RECURSE files RELATIVE "${ROOT}" "${ROOT}/${folder}/${glob}")
      list(APPEND found ${files})
    endforeach()
  endforeach()
  list(SORT found)
  set(${out} "${found}" PARENT_SCOPE)
endfunction()

# read_lines(<out> <file>): the file's lines as a list, safe for lines with semicolons or brackets.
function(read_lines out file)
  file(READ "${ROOT}/${file}" text)
  string(REPLACE ";" "," text "${text}")
  string(REPLACE "[" "(" text "${text}")
  string(REPLACE "]" ")" text "${text}")
  string(REPLACE "\\" "/" text "${text}")
  string(REGEX REPLACE "\n$" "" text "${text}")
  string(REPLACE "\n" ";" text "${text}")
  set(${out} "${text}" PARENT_SCOPE)
endfunction()

# read_table(<prefix> <names out> <file>): lines `name: words`; '#' begins a comment.
function(read_table prefix names file)
  file(STRINGS "${file}" lines REGEX "^[A-Za-z]")
  set(found "")
  foreach(line IN LISTS lines)
    if(NOT line MATCHES "^([A-Za-z0-9_+]+):(.*)$")
      message(SEND_ERROR "${file}: not 'name: words': ${line}")
      continue()
    endif()
    set(name "${CMAKE_MATCH_1}")
    string(REGEX REPLACE "#.*" "" words "${CMAKE_MATCH_2}")
    string(STRIP "${words}" words)
    separate_arguments(words)
    list(APPEND found "${name}")
    set(${prefix}_${name} "${words}" PARENT_SCOPE)
  endforeach()
  set(${names} "${found}" PARENT_SCOPE)
endfunction()
