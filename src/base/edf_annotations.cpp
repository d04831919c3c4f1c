// SPDX-License-Identifier: GPL-3.0-or-later
// EDF+ (Kemp & Olivan 2003), section 2.2: a block holds lists one after another, then zero bytes:
//
//   onset [\x15 duration] \x14 text \x14 text \x14 ... \x00
//
// onset: a sign, digits, perhaps a point and digits. duration: the same without a sign. In the
// first annotation signal the first text of the first list of each record is empty; its onset is
// that of the record.
#include "base/edf_annotations.hpp"

#include <headwater/base/error.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <charconv>
#include <limits>

namespace headwater {
namespace {

constexpr char kTextEnd = '\x14', kDurationBegin = '\x15';

/// Length of the UTF-8 character that `text` begins with; 0: it begins with none. Neither overlong
/// forms nor surrogates pass.
std::size_t utf8_length(std::string_view text) {
  const auto byte = [&](std::size_t i) {
    return i < text.size() ? static_cast<unsigned char>(text[i]) : 0u;
  };
  const unsigned lead = byte(0);
  if (lead < 0x80) return 1;
  const std::size_t length = lead >= 0xf0 ? 4 : lead >= 0xe0 ? 3 : 2;
  if (lead < 0xc2 || lead > 0xf4) return 0;
  for (std::size_t i = 1; i < length; ++i)
    if (byte(i) < 0x80 || byte(i) > 0xbf) return 0;
  const unsigned second = byte(1);
  if ((lead == 0xe0 && second < 0xa0) || (lead == 0xed && second > 0x9f) ||
      (lead == 0xf0 && second < 0x90) || (lead == 0xf4 && second > 0x8f))
    return 0;
  return length;
}

/// EDF+ asks for UTF-8. What is none is taken for Latin-1, which older writers used.
std::string as_utf8(std::string_view text) {
  std::size_t valid = 0;
  while (valid < text.size()) {
    const std::size_t length = utf8_length(text.substr(valid));
    if (length == 0) break;
    valid += length;
  }
  if (valid == text.size()) return std::string(text);
  std::string result;
  for (const char c : text) {
    const auto code = static_cast<unsigned char>(c);
    if (code < 0x80) {
      result += c;
    } else {
      result += static_cast<char>(0xc0 | (code >> 6));
      result += static_cast<char>(0x80 | (code & 0x3f));
    }
  }
  return result;
}

std::string shown(std::string_view text) {
  constexpr std::size_t kLongest = 40;
  std::string result;
  for (const char c : text.substr(0, kLongest))
    result += static_cast<unsigned char>(c) < 0x20 || c == 0x7f ? '?' : c;
  return "'" + as_utf8(result) + (text.size() > kLongest ? "..." : "") + "'";
}

/// Digits with at most one point; no exponent, no blanks.
std::optional<double> seconds(std::string_view text) {
  const auto digit_or_point = [](char c) { return (c >= '0' && c <= '9') || c == '.'; };
  if (text.empty() || !std::all_of(text.begin(), text.end(), digit_or_point)) return std::nullopt;
  double value = 0;
  const auto [end, error] = std::from_chars(text.data(), text.data() + text.size(), value);
  if (error != std::errc() || end != text.data() + text.size()) return std::nullopt;
  return value;
}

std::optional<double> signed_seconds(std::string_view text) {
  if (text.empty() || (text.front() != '+' && text.front() != '-')) return std::nullopt;
  const auto value = seconds(text.substr(1));
  if (!value) return std::nullopt;
  return text.front() == '-' ? -*value : *value;
}

/// One list without its final zero byte.
void parse_list(std::string_view list, bool keeps_time, const std::string& where,
                EdfAnnotationBlock& block) {
  const auto head_end = list.find(kTextEnd);
  if (head_end == std::string_view::npos || list.back() != kTextEnd)
    throw InputError(fmt::format("{}: the annotation {} is cut short.", where, shown(list)));
  const std::string_view head = list.substr(0, head_end);
  const auto onset_end = std::min(head.find(kDurationBegin), head.size());
  const auto onset = signed_seconds(head.substr(0, onset_end));
  if (!onset)
    throw InputError(
        fmt::format("{}: an annotation without onset: found {}, expected a sign and seconds, "
                    "then its text.",
                    where, shown(list)));
  double duration = std::numeric_limits<double>::quiet_NaN();
  if (onset_end + 1 < head.size()) {
    const auto value = seconds(head.substr(onset_end + 1));
    if (!value)
      throw InputError(fmt::format("{}: duration of an annotation: found {}, expected seconds.",
                                   where, shown(head.substr(onset_end + 1))));
    duration = *value;
  }
  std::string_view texts = list.substr(head_end + 1);
  if (keeps_time && (texts.empty() || texts.front() == kTextEnd)) block.stamp_s = onset;
  while (!texts.empty()) {
    const auto end = texts.find(kTextEnd);
    if (end > 0) block.annotations.push_back({*onset, duration, as_utf8(texts.substr(0, end))});
    texts.remove_prefix(end + 1);
  }
}

}  // namespace

EdfAnnotationBlock parse_edf_annotations(std::string_view block, bool keeps_time,
                                         const std::string& where) {
  EdfAnnotationBlock result;
  bool first = true;
  while (!block.empty()) {
    const auto end = std::min(block.find('\0'), block.size());
    if (end > 0) {
      parse_list(block.substr(0, end), keeps_time && first, where, result);
      first = false;
    }
    block.remove_prefix(std::min(end + 1, block.size()));
  }
  return result;
}

}  // namespace headwater
