// SPDX-License-Identifier: GPL-3.0-or-later
// An ordered JSON value: what side files, provenance and --json are made of.
#pragma once
#include <cstddef>
#include <filesystem>
#include <string>
#include <string_view>
#include <utility>
#include <variant>
#include <vector>

namespace headwater {

class Json {
 public:
  using Array = std::vector<Json>;
  using Object = std::vector<std::pair<std::string, Json>>;

  Json() = default;  // null
  Json(std::nullptr_t) {}
  Json(bool value) : value_(value) {}
  Json(int value) : value_(static_cast<long long>(value)) {}
  Json(long value) : value_(static_cast<long long>(value)) {}
  Json(long long value) : value_(value) {}
  Json(unsigned long value) : value_(static_cast<long long>(value)) {}
  Json(double value) : value_(value) {}  ///< NaN and infinities are written as null
  Json(const char* value) : value_(std::string(value)) {}
  Json(std::string value) : value_(std::move(value)) {}
  Json(Array value) : value_(std::move(value)) {}
  template <typename T>
  Json(const std::vector<T>& values) : value_(Array(values.begin(), values.end())) {}

  static Json object() { return Json(Object{}); }
  static Json array() { return Json(Array{}); }

  /// Sets a member of an object (turns null into an object), keeping the order of first setting.
  Json& set(const std::string& key, Json value);
  /// Appends to an array (turns null into an array).
  Json& push(Json value);

  bool is_null() const { return std::holds_alternative<std::monostate>(value_); }
  bool is_object() const { return std::holds_alternative<Object>(value_); }
  bool is_array() const { return std::holds_alternative<Array>(value_); }
  /// Member of an object, or null pointer.
  const Json* find(std::string_view key) const;
  const Array& items() const;     ///< throws std::logic_error when not an array
  const Object& members() const;  ///< throws std::logic_error when not an object
  std::string text() const;       ///< throws std::logic_error when not a string
  double number() const;          ///< throws std::logic_error when not a number

  /// Indented text, two spaces, members in order, numbers in shortest round-trip form; a list of
  /// plain values that fits a line stays on it.
  std::string dump() const;

 private:
  explicit Json(Object value) : value_(std::move(value)) {}
  void append_to(std::string& text, std::size_t indent) const;
  bool append_on_one_line(std::string& text, std::size_t indent) const;
  std::variant<std::monostate, bool, long long, double, std::string, Array, Object> value_;
};

/// Throws InputError with file, line and column.
Json read_json(const std::filesystem::path& path, std::string_view what);
Json parse_json(std::string_view text, const std::string& source);
void write_json(const std::filesystem::path& path, const Json& json);

}  // namespace headwater
