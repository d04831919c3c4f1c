// SPDX-License-Identifier: GPL-3.0-or-later
// toml++ keeps tables sorted by key; the order of the document is restored from the place of each
// key.
#include <headwater/base/atomic_file.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/toml.hpp>

#include <fmt/core.h>
#include <toml++/toml.h>

#include <algorithm>
#include <sstream>
#include <stdexcept>

namespace headwater {
namespace {

template <typename Node>
std::string as_text(const Node& node) {
  std::ostringstream text;
  text.imbue(std::locale::classic());
  text << node.get();
  return text.str();
}

TomlValue converted(const toml::node& node);

TomlValue::Table converted_members(const toml::table& table) {
  struct Entry {
    toml::source_position place;
    TomlValue value;
    std::string key;
  };
  std::vector<Entry> entries;
  for (const auto& [key, node] : table)
    entries.push_back({key.source().begin, converted(node), std::string(key.str())});
  std::stable_sort(entries.begin(), entries.end(),
                   [](const Entry& a, const Entry& b) { return a.place < b.place; });
  TomlValue::Table members;
  for (auto& entry : entries) {
    // A table that only its children name ([a.b] names a) has no place of its own: its key has.
    if (entry.value.line == 0) {
      entry.value.line = static_cast<int>(entry.place.line);
      entry.value.column = static_cast<int>(entry.place.column);
    }
    members.emplace_back(std::move(entry.key), std::move(entry.value));
  }
  return members;
}

TomlValue converted(const toml::node& node) {
  TomlValue result;
  result.line = static_cast<int>(node.source().begin.line);
  result.column = static_cast<int>(node.source().begin.column);
  if (const auto* table = node.as_table()) {
    result.value = converted_members(*table);
  } else if (const auto* array = node.as_array()) {
    TomlValue::Array items;
    for (const auto& item : *array) items.push_back(converted(item));
    result.value = std::move(items);
  } else if (const auto* text = node.as_string()) {
    result.value = text->get();
  } else if (const auto* integer = node.as_integer()) {
    result.value = static_cast<long long>(integer->get());
  } else if (const auto* real = node.as_floating_point()) {
    result.value = real->get();
  } else if (const auto* flag = node.as_boolean()) {
    result.value = flag->get();
  } else if (const auto* date = node.as_date()) {
    result.value = as_text(*date);
  } else if (const auto* time = node.as_time()) {
    result.value = as_text(*time);
  } else if (const auto* moment = node.as_date_time()) {
    result.value = as_text(*moment);
  }
  return result;
}

}  // namespace

double TomlValue::number() const {
  if (const auto* integer = std::get_if<long long>(&value)) return static_cast<double>(*integer);
  if (const auto* real = std::get_if<double>(&value)) return *real;
  throw std::logic_error("TomlValue::number of " + kind());
}

const TomlValue* TomlValue::find(std::string_view key) const {
  const auto* table = std::get_if<Table>(&value);
  if (!table) return nullptr;
  for (const auto& [name, member] : *table)
    if (name == key) return &member;
  return nullptr;
}

std::string TomlValue::kind() const {
  if (is_number()) return "a number";
  if (is_text()) return "text";
  if (is_array()) return "a list";
  if (is_table()) return "a table";
  return "true or false";
}

TomlValue parse_toml(std::string_view text, const std::string& source) {
  if (text.substr(0, 3) == "\xef\xbb\xbf") text.remove_prefix(3);
  try {
    TomlValue result = converted(toml::parse(text, std::string_view(source)));
    result.line = result.column = 1;
    return result;
  } catch (const toml::parse_error& error) {
    const auto place = error.source().begin;
    throw ExperimentError(
        fmt::format("{}:{}:{}: {}", source, place.line, place.column, error.description()));
  }
}

TomlValue read_toml(const std::filesystem::path& path) {
  std::string text;
  try {
    text = read_file(path, "experiment file");
  } catch (const InputError& error) {  // to the user it is the command that names the wrong file
    throw ExperimentError(error.what());
  }
  return parse_toml(text, path.string());
}

}  // namespace headwater
