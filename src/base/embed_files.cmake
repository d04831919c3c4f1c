# SPDX-License-Identifier: GPL-3.0-or-later
# cmake -DOUTPUT=<.cpp> -DFILES=<list> -P embed_files.cmake
# Writes embedded_file.hpp's function with the content of each file as a byte array.
set(table "")
set(text "// Generated from templates/.\n#include <headwater/base/embedded_file.hpp>\n#include <stdexcept>\n#include <string>\nnamespace headwater {\nnamespace {\n")
set(index 0)
foreach(file IN LISTS FILES)
  get_filename_component(name "${file}" NAME)
  file(READ "${file}" hex HEX)
  string(REGEX REPLACE "([0-9a-f][0-9a-f])" "'\\\\x\\1'," bytes "${hex}")
  string(APPEND text "const char kFile${index}[] = {${bytes}'\\0'};\n")
  string(APPEND table "  if (name == \"${name}\") return {kFile${index}, sizeof kFile${index} - 1};\n")
  math(EXPR index "${index}+1")
endforeach()
string(APPEND text "}  // namespace\nstd::string_view embedded_file(std::string_view name) {\n${table}  throw std::logic_error(\"no embedded file \" + std::string(name));\n}\n}  // namespace headwater\n")
file(WRITE "${OUTPUT}" "${text}")
