// SPDX-License-Identifier: GPL-3.0-or-later
// Checks a TOML tree against key_records() and hands out values with their defaults. Collects every
// problem, with file:line:column, instead of stopping at the first.
#pragma once
#include <headwater/app/keys.hpp>
#include <headwater/base/labels.hpp>
#include <headwater/base/toml.hpp>

#include <optional>
#include <string>
#include <vector>

namespace headwater {

class KeyReader {
 public:
  KeyReader(const TomlValue& root, std::string source);

  /// Adds a problem at a value (null: the file as a whole).
  void problem(const TomlValue* where, const std::string& text);
  const std::vector<std::string>& problems() const { return problems_; }

  /// Value of "head.radius_mm" or, within an entry of [[contrasts]], of "name". Null where absent.
  const TomlValue* find(const std::string& key) const;
  bool has(const std::string& key) const { return find(key) != nullptr; }
  std::string text(const std::string& key) const;  ///< the default where absent
  double number(const std::string& key) const;
  std::vector<double> numbers(const std::string& key) const;
  Labels texts(const std::string& key) const;
  bool flag(const std::string& key) const;
  /// Entries of [[name]], empty where absent.
  std::vector<const TomlValue*> entries(const std::string& name) const;

 private:
  void check_table(const TomlValue& table, const std::string& prefix);
  void check_value(const TomlValue& value, const KeyRecord& record);
  /// Each member of a table of numbers or of texts.
  void check_members(const TomlValue& table, const KeyRecord& record);
  void check_number(const TomlValue& value, const KeyRecord& record);
  void check_text(const TomlValue& value, const KeyRecord& record);
  void check_required(const TomlValue& table, const std::string& prefix);

  const TomlValue* root_;
  TomlValue defaults_;
  std::string source_;
  std::vector<std::string> problems_;
};

/// Text member of an entry of an array of tables, or "".
std::string text_of(const TomlValue& entry, const std::string& key);
Labels texts_of(const TomlValue& entry, const std::string& key);

}  // namespace headwater
