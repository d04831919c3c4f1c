// SPDX-License-Identifier: GPL-3.0-or-later
// Every key of the experiment file, in one table: what `headwater keys` prints and what the reader
// checks types, ranges and choices against.
#pragma once
#include <string>
#include <vector>

namespace headwater {

enum class KeyType {
  text,
  path,  // text, relative to the experiment file
  number,
  whole_number,
  true_false,
  text_list,
  number_list,
  text_map,    // { from = "to" }
  number_map,  // { name = number }
  effect_map,  // { factor = ["first", "second"] }
  list_map,    // { name = ["a", "b", ...] }
  number_or_text,
  rule,  // text, or { snr = number } or { lambda = number }
};

struct KeyRecord {
  std::string name;  ///< "head.radius_mm"; "contrasts[].name" for [[contrasts]]
  KeyType type;
  std::string unit;                  ///< "" when it has none
  double least = 0, most = 0;        ///< of numbers (each of a list); equal: any
  std::vector<std::string> choices;  ///< of text; empty: any
  /// Default as it would be written; "required", "required here" (where its section is there), or
  /// "" (none).
  std::string standard;
  std::string meaning;
};

const std::vector<KeyRecord>& key_records();

/// "a number", "a list of texts", ...
std::string type_name(KeyType type);

/// The table of keys as text for a terminal, `like` empty or a part of a key's name.
std::string keys_text(const std::string& like);

}  // namespace headwater
