// SPDX-License-Identifier: GPL-3.0-or-later
// Reading and the escaping of text: nlohmann-json. Layout is our own: a list of plain values that
// fits a line stays on it, so that vectors and rows of matrices can be read.
#include <headwater/base/atomic_file.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/json.hpp>

#include <fmt/core.h>
#include <nlohmann/json.hpp>

#include <algorithm>
#include <charconv>
#include <cmath>
#include <limits>
#include <stdexcept>

namespace headwater {
namespace {

using Parsed = nlohmann::ordered_json;
constexpr int kDeepest = 200;  // nesting; deeper text is no side file of anyone's
constexpr std::size_t kLineLength = 100;

Json converted(const Parsed& parsed) {
  switch (parsed.type()) {
    case Parsed::value_t::boolean:
      return parsed.get<bool>();
    case Parsed::value_t::number_integer:
      return parsed.get<long long>();
    case Parsed::value_t::number_unsigned: {
      const auto value = parsed.get<unsigned long long>();
      if (value > static_cast<unsigned long long>(std::numeric_limits<long long>::max()))
        return static_cast<double>(value);
      return static_cast<long long>(value);
    }
    case Parsed::value_t::number_float:
      return parsed.get<double>();
    case Parsed::value_t::string:
      return parsed.get<std::string>();
    case Parsed::value_t::array: {
      Json::Array items;
      items.reserve(parsed.size());
      for (const auto& item : parsed) items.push_back(converted(item));
      return items;
    }
    case Parsed::value_t::object: {
      Json result = Json::object();
      for (const auto& [key, value] : parsed.items()) result.set(key, converted(value));
      return result;
    }
    default:
      return nullptr;
  }
}

std::string quoted(const std::string& text) {
  return nlohmann::json(text).dump(-1, ' ', false, nlohmann::json::error_handler_t::replace);
}

std::string shortest(double value) {
  if (!std::isfinite(value)) return "null";
  char buffer[32];
  return {buffer, std::to_chars(buffer, buffer + sizeof buffer, value).ptr};
}

/// "file, line 3, column 7" of a byte (from 1, as the parser counts).
std::string position(const std::string& source, std::string_view text, std::size_t byte) {
  const auto before = text.substr(0, byte > 0 ? byte - 1 : 0);
  const auto line = std::count(before.begin(), before.end(), '\n') + 1;
  const auto start = before.rfind('\n');
  const auto column = before.size() - (start == std::string_view::npos ? 0 : start + 1) + 1;
  return fmt::format("{}, line {}, column {}", source, line, column);
}

}  // namespace

Json& Json::set(const std::string& key, Json value) {
  if (is_null()) value_ = Object{};
  if (!is_object()) throw std::logic_error("Json::set on a value that is not an object");
  auto& object = std::get<Object>(value_);
  const auto found = std::find_if(object.begin(), object.end(),
                                  [&](const auto& entry) { return entry.first == key; });
  if (found != object.end())
    found->second = std::move(value);
  else
    object.emplace_back(key, std::move(value));
  return *this;
}

Json& Json::push(Json value) {
  if (is_null()) value_ = Array{};
  if (!is_array()) throw std::logic_error("Json::push on a value that is not an array");
  std::get<Array>(value_).push_back(std::move(value));
  return *this;
}

const Json* Json::find(std::string_view key) const {
  if (!is_object()) return nullptr;
  for (const auto& [name, value] : members())
    if (name == key) return &value;
  return nullptr;
}

const Json::Array& Json::items() const {
  if (!is_array()) throw std::logic_error("Json::items of a value that is not an array");
  return std::get<Array>(value_);
}

const Json::Object& Json::members() const {
  if (!is_object()) throw std::logic_error("Json::members of a value that is not an object");
  return std::get<Object>(value_);
}

std::string Json::text() const {
  if (const auto* text = std::get_if<std::string>(&value_)) return *text;
  throw std::logic_error("Json::text of a value that is not text");
}

double Json::number() const {
  if (const auto* value = std::get_if<double>(&value_)) return *value;
  if (const auto* value = std::get_if<long long>(&value_)) return static_cast<double>(*value);
  throw std::logic_error("Json::number of a value that is not a number");
}

std::string Json::dump() const {
  std::string text;
  append_to(text, 0);
  return text;
}

bool Json::append_on_one_line(std::string& text, std::size_t indent) const {
  std::string line = "[";
  for (const auto& item : items()) {
    if (item.is_array() || item.is_object()) return false;
    if (line.size() > 1) line += ", ";
    item.append_to(line, 0);
    if (indent + line.size() >= kLineLength) return false;
  }
  text += line + "]";
  return true;
}

void Json::append_to(std::string& text, std::size_t indent) const {
  const auto new_line = [&](std::size_t depth) { text.append("\n").append(depth, ' '); };
  if (const auto* flag = std::get_if<bool>(&value_)) {
    text += *flag ? "true" : "false";
  } else if (const auto* integer = std::get_if<long long>(&value_)) {
    text += std::to_string(*integer);
  } else if (const auto* real = std::get_if<double>(&value_)) {
    text += shortest(*real);
  } else if (const auto* string = std::get_if<std::string>(&value_)) {
    text += quoted(*string);
  } else if (is_array()) {
    if (append_on_one_line(text, indent)) return;
    text += '[';
    for (const auto& item : items()) {
      if (&item != &items().front()) text += ',';
      new_line(indent + 2);
      item.append_to(text, indent + 2);
    }
    new_line(indent);
    text += ']';
  } else if (is_object()) {
    text += '{';
    for (const auto& member : members()) {
      if (&member != &members().front()) text += ',';
      new_line(indent + 2);
      text += quoted(member.first) + ": ";
      member.second.append_to(text, indent + 2);
    }
    if (!members().empty()) new_line(indent);
    text += '}';
  } else {
    text += "null";
  }
}

Json parse_json(std::string_view text, const std::string& source) {
  const auto check_depth = [&](int depth, Parsed::parse_event_t, Parsed&) {
    if (depth > kDeepest)
      throw InputError(fmt::format("{}: nested more than {} levels deep.", source, kDeepest));
    return true;
  };
  try {
    return converted(Parsed::parse(text.begin(), text.end(), check_depth));
  } catch (const nlohmann::json::parse_error& error) {
    std::string reason =
        error.what();  // "[json.exception...] parse error at line 1, column 2: ..."
    const auto colon = reason.find(": ");
    if (colon != std::string::npos) reason.erase(0, colon + 2);
    throw InputError(
        fmt::format("{}: not valid JSON: {}.", position(source, text, error.byte), reason));
  } catch (const nlohmann::json::out_of_range& error) {
    throw InputError(fmt::format("{}: a number is out of range: {}.", source, error.what()));
  }
}

Json read_json(const std::filesystem::path& path, std::string_view what) {
  return parse_json(read_file(path, what), path.string());
}

void write_json(const std::filesystem::path& path, const Json& json) {
  write_file(path, json.dump() + "\n");
}

}  // namespace headwater
