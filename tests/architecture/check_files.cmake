# SPDX-License-Identifier: GPL-3.0-or-later
# Each source file carries its licence line; one of more than 400 lines says why near its top
# ("Over 400 lines: <reason>"); none knows a path of the machine it was written on, or keeps a mark
# of unfinished work.
include("${CMAKE_CURRENT_LIST_DIR}/project_files.cmake")
set(longest 400)
# Folders that differ from machine to machine. The brackets keep this line from matching itself.
set(machine_path "(^|[^A-Za-z0-9_.}/])[/](home|root|mnt|media|opt|srv|tmp|work|Users)[/]")
set(unfinished "TO[D]O|FIX[M]E|not imple[m]ented")

project_files(sources *.hpp *.cpp *.cmake *.cmake.in *.sh *.py CMakeLists.txt run)
list(APPEND sources CMakeLists.txt)
foreach(file IN LISTS sources)
  read_lines(lines "${file}")
  list(LENGTH lines count)
  list(SUBLIST lines 0 20 top)
  if(NOT top MATCHES "SPDX-License-Identifier: GPL-3.0-or-later")
    message(SEND_ERROR "${file}: no SPDX line at the top")
  endif()
  if(count GREATER longest AND NOT top MATCHES "Over 400 lines: [a-z]")
    message(SEND_ERROR "${file}: ${count} lines and no 'Over 400 lines: <reason>' at the top")
  endif()
endforeach()

project_files(documents *.md *.toml *.tsv *.txt *.json *.in)
foreach(file IN LISTS sources documents ITEMS README.md DEVELOPERS.md CMakePresets.json)
  read_lines(lines "${file}")
  set(number 0)
  foreach(line IN LISTS lines)
    math(EXPR number "${number} + 1")
    if(line MATCHES "${machine_path}")
      message(SEND_ERROR "${file}:${number}: a path of one machine: ${line}")
    endif()
    if(line MATCHES "${unfinished}")
      message(SEND_ERROR "${file}:${number}: unfinished: ${line}")
    endif()
  endforeach()
endforeach()
