// SPDX-License-Identifier: GPL-3.0-or-later
// Edit distance: optimal string alignment (insert, delete, replace, swap of neighbours; Damerau
// 1964, Commun ACM 7:171), the four slips of the keyboard.
#include <headwater/base/error.hpp>
#include <headwater/base/labels.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <cstdint>
#include <unordered_map>
#include <vector>

namespace headwater {
namespace {

// The functions of <cctype> depend on the locale.
bool is_letter_or_digit(char c) {
  return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (c >= '0' && c <= '9');
}
char lower(char c) {
  return c >= 'A' && c <= 'Z' ? static_cast<char>(c - 'A' + 'a') : c;
}
char upper(char c) {
  return c >= 'a' && c <= 'z' ? static_cast<char>(c - 'a' + 'A') : c;
}

std::size_t edit_distance(std::string_view a, std::string_view b) {
  std::vector<std::vector<std::size_t>> d(a.size() + 1, std::vector<std::size_t>(b.size() + 1));
  for (std::size_t i = 0; i <= a.size(); ++i) d[i][0] = i;
  for (std::size_t j = 0; j <= b.size(); ++j) d[0][j] = j;
  for (std::size_t i = 1; i <= a.size(); ++i)
    for (std::size_t j = 1; j <= b.size(); ++j) {
      d[i][j] = std::min(
          {d[i - 1][j] + 1, d[i][j - 1] + 1, d[i - 1][j - 1] + (a[i - 1] == b[j - 1] ? 0 : 1)});
      if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1])
        d[i][j] = std::min(d[i][j], d[i - 2][j - 2] + 1);
    }
  return d[a.size()][b.size()];
}

}  // namespace

std::string fold_case(std::string_view text) {
  std::string result(text);
  std::transform(result.begin(), result.end(), result.begin(), lower);
  return result;
}

std::optional<Eigen::Index> find_label(const Labels& labels, std::string_view name) {
  const auto found = std::find(labels.begin(), labels.end(), name);
  if (found == labels.end()) return std::nullopt;
  return found - labels.begin();
}

std::optional<Eigen::Index> find_label_any_case(const Labels& labels, std::string_view name) {
  const std::string folded = fold_case(name);
  const auto found = std::find_if(labels.begin(), labels.end(), [&](const std::string& label) {
    return label.size() == folded.size() && fold_case(label) == folded;
  });
  if (found == labels.end()) return std::nullopt;
  return found - labels.begin();
}

std::vector<Eigen::Index> match_labels(const Labels& wanted, const Labels& available,
                                       const std::string& where) {
  std::unordered_map<std::string_view, Eigen::Index> position;
  for (std::size_t i = 0; i < available.size(); ++i)
    position.emplace(available[i], static_cast<Eigen::Index>(i));
  std::vector<Eigen::Index> result;
  Labels missing;
  std::string hint;
  for (const auto& name : wanted) {
    const auto found = position.find(name);
    if (found != position.end()) {
      result.push_back(found->second);
      continue;
    }
    missing.push_back(name);
    if (hint.empty()) hint = did_you_mean(name, available);
  }
  if (missing.empty()) return result;
  if (missing.size() > 1) hint.clear();  // it would be unclear which name the hint is for
  throw InputError(fmt::format("{}: {} of {} wanted labels not found: {}.{} Found there: {}.",
                               where, missing.size(), wanted.size(), join_labels(missing), hint,
                               available.empty() ? "nothing" : join_labels(available)));
}

Labels repeated_labels(const Labels& labels) {
  std::unordered_map<std::string, int> count;
  Labels result;
  for (const auto& label : labels)
    if (++count[fold_case(label)] == 2) result.push_back(label);
  return result;
}

std::string nearest_label(std::string_view name, const Labels& candidates) {
  const std::string folded = fold_case(name);
  std::string best;
  std::size_t best_distance = SIZE_MAX;
  for (const auto& candidate : candidates) {
    const std::size_t length = std::max(name.size(), candidate.size());
    const std::size_t near_enough = std::max<std::size_t>(1, length / 3);
    // Lengths alone tell most candidates apart; one letter for another is not a slip but another
    // name.
    if (length - std::min(name.size(), candidate.size()) > near_enough) continue;
    const std::size_t distance = edit_distance(folded, fold_case(candidate));
    if (distance > near_enough || (distance > 0 && distance >= length)) continue;
    if (distance < best_distance) {
      best = candidate;
      best_distance = distance;
    }
  }
  return best;
}

std::string did_you_mean(std::string_view name, const Labels& candidates) {
  const std::string nearest = nearest_label(name, candidates);
  return nearest.empty() ? "" : fmt::format(" Did you mean '{}'?", nearest);
}

std::string file_label(std::string_view text) {
  std::string result;
  bool new_word = false;
  for (const char c : text) {
    if (is_letter_or_digit(c)) {
      result.push_back(new_word && !result.empty() ? upper(c) : c);
      new_word = false;
    } else if (static_cast<unsigned char>(c) < 0x80) {
      new_word = true;  // bytes of non-ASCII letters fall out without parting the word
    }
  }
  if (!result.empty() || text.empty()) return result;
  // A name without any ASCII letter still needs a file of its own: 32-bit FNV-1a of its bytes.
  std::uint32_t hash = 2166136261u;
  for (const char c : text) hash = (hash ^ static_cast<unsigned char>(c)) * 16777619u;
  return fmt::format("x{:08x}", hash);
}

std::string join_labels(const Labels& labels) {
  std::string result;
  for (std::size_t i = 0; i < labels.size(); ++i) {
    if (i > 0) result += i + 1 == labels.size() ? " and " : ", ";
    result += labels[i];
  }
  return result;
}

}  // namespace headwater
