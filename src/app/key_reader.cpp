// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/key_reader.hpp"

#include <fmt/core.h>

#include <algorithm>
#include <cmath>

namespace headwater {
namespace {

using T = KeyType;

/// The part of a key before its last dot: "head", "conditions[]", "".
std::string parent_of(const std::string& key) {
  const auto dot = key.rfind('.');
  return dot == std::string::npos ? "" : key.substr(0, dot);
}

const KeyRecord* record_of(const std::string& key) {
  const auto& records = key_records();
  const auto found = std::find_if(records.begin(), records.end(),
                                  [&](const KeyRecord& record) { return record.name == key; });
  return found != records.end() ? &*found : nullptr;
}

bool is_section(const std::string& name) {
  return std::any_of(key_records().begin(), key_records().end(),
                     [&](const KeyRecord& record) { return parent_of(record.name) == name; });
}

/// Names that may stand in a table, for suggestions.
Labels names_within(const std::string& prefix) {
  Labels names;
  for (const auto& record : key_records()) {
    std::string rest = record.name;
    if (!prefix.empty()) {
      if (parent_of(rest) != prefix) continue;
      rest = rest.substr(prefix.size() + 1);
    } else if (const auto dot = rest.find_first_of(".["); dot != std::string::npos) {
      rest = rest.substr(0, dot);
    }
    if (rest != "*" && !find_label(names, rest)) names.push_back(rest);
  }
  return names;
}

bool is_text_list(const TomlValue& value) {
  if (!value.is_array()) return false;
  const auto& items = std::get<TomlValue::Array>(value.value);
  return std::all_of(items.begin(), items.end(),
                     [](const TomlValue& item) { return item.is_text(); });
}

bool has_type(const TomlValue& value, KeyType type) {
  const auto all_members = [&](auto accepts) {
    if (!value.is_table()) return false;
    const auto& members = std::get<TomlValue::Table>(value.value);
    return std::all_of(members.begin(), members.end(),
                       [&](const auto& member) { return accepts(member.second); });
  };
  switch (type) {
    case T::text:
    case T::path:
      return value.is_text();
    case T::number:
      return value.is_number();
    case T::whole_number:
      return std::holds_alternative<long long>(value.value);
    case T::true_false:
      return std::holds_alternative<bool>(value.value);
    case T::text_list:
      return is_text_list(value);
    case T::number_list: {
      if (!value.is_array()) return false;
      const auto& items = std::get<TomlValue::Array>(value.value);
      return std::all_of(items.begin(), items.end(),
                         [](const TomlValue& item) { return item.is_number(); });
    }
    case T::text_map:
      return all_members([](const TomlValue& v) { return v.is_text(); });
    case T::number_map:
      return all_members([](const TomlValue& v) { return v.is_number(); });
    case T::effect_map:
      return all_members([](const TomlValue& v) {
        return is_text_list(v) && std::get<TomlValue::Array>(v.value).size() == 2;
      });
    case T::list_map:
      return all_members(is_text_list);
    case T::number_or_text:
      return value.is_number() || value.is_text();
    case T::rule: {
      if (value.is_text()) return true;
      if (!value.is_table()) return false;
      const auto& members = std::get<TomlValue::Table>(value.value);
      return members.size() == 1 && (members[0].first == "snr" || members[0].first == "lambda") &&
             members[0].second.is_number() && members[0].second.number() > 0;
    }
  }
  return false;
}

TomlValue make_defaults() {
  std::string document;
  std::string section;
  for (const auto& record : key_records()) {
    if (record.name.find("[]") != std::string::npos || record.standard.empty() ||
        record.standard.starts_with("required"))
      continue;
    if (const auto parent = parent_of(record.name); parent != section) {
      document += "[" + parent + "]\n";
      section = parent;
    }
    document += record.name.substr(section.empty() ? 0 : section.size() + 1) + " = " +
                record.standard + "\n";
  }
  return parse_toml(document, "defaults");
}

const TomlValue* find_in(const TomlValue& root, const std::string& key) {
  const TomlValue* at = &root;
  std::size_t begin = 0;
  while (at && begin <= key.size()) {
    const auto dot = std::min(key.find('.', begin), key.size());
    at = at->is_table() ? at->find(key.substr(begin, dot - begin)) : nullptr;
    begin = dot + 1;
  }
  return at;
}

}  // namespace

KeyReader::KeyReader(const TomlValue& root, std::string source)
    : root_(&root), defaults_(make_defaults()), source_(std::move(source)) {
  check_table(root, "");
  check_required(root, "");
  for (const auto& record : key_records()) {  // sections that are not there at all
    const std::string section = parent_of(record.name);
    if (record.standard == "required" && !section.empty() && !section.ends_with("[]") &&
        !root.find(section))
      problem(nullptr, fmt::format("'{}' is missing: {}", record.name, record.meaning));
  }
}

void KeyReader::problem(const TomlValue* where, const std::string& text) {
  problems_.push_back(where ? fmt::format("{}:{}:{}: {}", source_, where->line, where->column, text)
                            : fmt::format("{}: {}", source_, text));
}

void KeyReader::check_table(const TomlValue& table, const std::string& prefix) {
  for (const auto& [name, value] : std::get<TomlValue::Table>(table.value)) {
    const std::string key = prefix.empty() ? name : fmt::format("{}.{}", prefix, name);
    if (const auto* record = record_of(key)) {
      check_value(value, *record);
    } else if (const auto* any = record_of(prefix + ".*")) {
      KeyRecord named = *any;
      named.name = key;
      check_value(value, named);
    } else if (is_section(key)) {
      if (value.is_table()) {
        check_table(value, key);
        check_required(value, key);
      } else {
        problem(&value, fmt::format("'{0}' is {1}: expected a section [{0}].", key, value.kind()));
      }
    } else if (is_section(key + "[]")) {
      for (const auto* entry : entries(name)) {
        check_table(*entry, key + "[]");
        check_required(*entry, key + "[]");
      }
      if (!value.is_array() || entries(name).empty())
        problem(&value, fmt::format("'{0}' is {1}: expected entries [[{0}]].", key, value.kind()));
    } else {
      problem(&value, fmt::format("unknown key '{}'.{} `headwater keys` lists them.", key,
                                  did_you_mean(name, names_within(prefix))));
    }
  }
}

void KeyReader::check_required(const TomlValue& table, const std::string& prefix) {
  for (const auto& record : key_records())
    if (record.standard.starts_with("required") && parent_of(record.name) == prefix) {
      const std::string name = record.name.substr(prefix.empty() ? 0 : prefix.size() + 1);
      if (!table.find(name))
        problem(&table, fmt::format("'{}' is missing: {}", record.name, record.meaning));
    }
}

void KeyReader::check_number(const TomlValue& value, const KeyRecord& record) {
  const double number = value.number();
  if (!std::isfinite(number) ||
      (record.least < record.most && !(number >= record.least && number <= record.most)))
    problem(&value,
            fmt::format("'{}' is {:g}: expected {:g} to {:g}{}{}.", record.name, number,
                        record.least, record.most, record.unit.empty() ? "" : " ", record.unit));
}

void KeyReader::check_text(const TomlValue& value, const KeyRecord& record) {
  const auto& text = std::get<std::string>(value.value);
  if (text.empty() && record.standard.starts_with("required"))
    problem(&value, fmt::format("'{}' is empty: {}", record.name, record.meaning));
  if (record.choices.empty()) return;
  if (!find_label_any_case(record.choices, text))
    problem(&value, fmt::format("'{}' is \"{}\": expected {}.{}", record.name, text,
                                join_labels(record.choices), did_you_mean(text, record.choices)));
}

void KeyReader::check_members(const TomlValue& table, const KeyRecord& record) {
  const bool numbers = record.type == T::number_map;
  for (const auto& [name, value] : std::get<TomlValue::Table>(table.value))
    if (numbers ? !value.is_number() : !value.is_text())
      problem(&value, fmt::format("'{}.{}' is {}: expected {}.", record.name, name, value.kind(),
                                  type_name(numbers ? T::number : T::text)));
}

void KeyReader::check_value(const TomlValue& value, const KeyRecord& record) {
  if (value.is_table() && (record.type == T::number_map || record.type == T::text_map)) {
    check_members(value, record);
    return;
  }
  if (!has_type(value, record.type)) {
    std::string expected = type_name(record.type);
    if (record.type == T::effect_map) expected = "{ factor = [\"first level\", \"second level\"] }";
    if (record.type == T::rule)
      expected = "\"gcv\", \"l-curve\", { snr = number } or { lambda = number }, above 0";
    problem(&value, fmt::format("'{}' is {}: expected {}.", record.name, value.kind(), expected));
    return;
  }
  if (value.is_number()) check_number(value, record);
  if (value.is_text()) check_text(value, record);
  if (value.is_array())
    for (const auto& item : std::get<TomlValue::Array>(value.value)) {
      if (item.is_number()) check_number(item, record);
      if (item.is_text()) check_text(item, record);
    }
}

const TomlValue* KeyReader::find(const std::string& key) const {
  return find_in(*root_, key);
}

std::string KeyReader::text(const std::string& key) const {
  const auto* value = find(key);
  if (!value) value = find_in(defaults_, key);
  return value && value->is_text() ? std::get<std::string>(value->value) : "";
}

double KeyReader::number(const std::string& key) const {
  const auto* value = find(key);
  if (!value) value = find_in(defaults_, key);
  return value && value->is_number() ? value->number() : 0;
}

bool KeyReader::flag(const std::string& key) const {
  const auto* value = find(key);
  if (!value) value = find_in(defaults_, key);
  const auto* flag = value ? std::get_if<bool>(&value->value) : nullptr;
  return flag && *flag;
}

std::vector<double> KeyReader::numbers(const std::string& key) const {
  const auto* value = find(key);
  if (!value) value = find_in(defaults_, key);
  std::vector<double> numbers;
  if (value && has_type(*value, T::number_list))
    for (const auto& item : std::get<TomlValue::Array>(value->value))
      numbers.push_back(item.number());
  return numbers;
}

Labels KeyReader::texts(const std::string& key) const {
  const auto* value = find(key);
  if (!value) value = find_in(defaults_, key);
  Labels texts;
  if (value && is_text_list(*value))
    for (const auto& item : std::get<TomlValue::Array>(value->value))
      texts.push_back(std::get<std::string>(item.value));
  return texts;
}

std::vector<const TomlValue*> KeyReader::entries(const std::string& name) const {
  std::vector<const TomlValue*> entries;
  const auto* value = find(name);
  if (value && value->is_array())
    for (const auto& item : std::get<TomlValue::Array>(value->value))
      if (item.is_table()) entries.push_back(&item);
  return entries;
}

std::string text_of(const TomlValue& entry, const std::string& key) {
  const auto* value = entry.find(key);
  return value && value->is_text() ? std::get<std::string>(value->value) : "";
}

Labels texts_of(const TomlValue& entry, const std::string& key) {
  Labels texts;
  const auto* value = entry.find(key);
  if (value && is_text_list(*value))
    for (const auto& item : std::get<TomlValue::Array>(value->value))
      texts.push_back(std::get<std::string>(item.value));
  return texts;
}

}  // namespace headwater
