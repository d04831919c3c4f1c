// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/chosen_events.hpp"

#include "signal/problems.hpp"

#include <headwater/base/error.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <charconv>
#include <map>
#include <optional>

namespace headwater {
namespace {

constexpr std::size_t kMostListed = 12;  // values of a column in a message

std::optional<double> number_in(const std::string& text) {
  double value = 0;
  const char* end = text.data() + text.size();
  const auto [stop, error] = std::from_chars(text.data(), end, value);
  if (error != std::errc() || stop != end) return std::nullopt;
  return value;
}

bool same_value(const std::string& cell, const std::string& wanted) {
  if (cell == wanted) return true;
  const auto a = number_in(cell), b = number_in(wanted);
  return a && b && *a == *b;
}

/// "20 x object, 19 x repeat".
std::string values_with_counts(const Table& events, std::size_t column) {
  std::map<std::string, int> counts;
  for (const auto& row : events.rows) ++counts[row[column]];
  std::string text;
  std::size_t listed = 0;
  for (const auto& [value, count] : counts) {
    if (listed == kMostListed) return text + fmt::format(", ... ({} values)", counts.size());
    text += fmt::format("{}{} x {}", listed == 0 ? "" : ", ", count, value);
    ++listed;
  }
  return text;
}

/// Rows of one choice; problems are added to the list.
std::vector<std::size_t> rows_of(const Table& events, const EventChoice& choice,
                                 std::vector<std::string>& problems) {
  std::vector<std::pair<std::size_t, std::string>> wanted;
  bool known = true;
  for (const auto& [name, value] : choice.where) {
    if (const auto column = events.find_column(name)) {
      wanted.emplace_back(*column, value);
      continue;
    }
    known = false;
    problems.push_back(fmt::format(
        "condition '{}': the events have no column '{}'.{} They have {}.", choice.condition, name,
        did_you_mean(name, events.columns), join_labels(events.columns)));
  }
  std::vector<std::size_t> rows;
  if (!known) return rows;
  for (std::size_t r = 0; r < events.rows.size(); ++r)
    if (std::all_of(wanted.begin(), wanted.end(),
                    [&](const auto& w) { return same_value(events.rows[r][w.first], w.second); }))
      rows.push_back(r);
  if (!rows.empty()) return rows;
  std::string asked, there;
  for (const auto& [column, value] : wanted) {
    asked += fmt::format("{}{} = {}", asked.empty() ? "" : ", ", events.columns[column], value);
    there += fmt::format(" {}: {}.", events.columns[column], values_with_counts(events, column));
  }
  problems.push_back(fmt::format("condition '{}': no event with {}. The events have{}",
                                 choice.condition, asked, there));
  return rows;
}

}  // namespace

std::vector<ChosenEvent> choose_events(const Table& events, const std::vector<EventChoice>& choices,
                                       const std::string& recording) {
  if (events.rows.empty())
    throw InputError(fmt::format(
        "{}: no events: neither a file of events beside it nor annotations in it.", recording));
  std::vector<std::string> problems;
  std::vector<std::optional<std::size_t>> owner(events.rows.size());
  std::vector<ChosenEvent> chosen;
  const std::size_t onset = events.column("onset");
  for (std::size_t place = 0; place < choices.size(); ++place) {
    const std::vector<std::size_t> rows = rows_of(events, choices[place], problems);
    std::vector<std::size_t> shared;
    for (const std::size_t row : rows) {
      if (owner[row]) shared.push_back(row);
      owner[row] = place;
    }
    if (!shared.empty())
      problems.push_back(fmt::format(
          "{} events of condition '{}' belong to another condition too, first that of line {}: "
          "state what tells them apart.",
          shared.size(), choices[place].condition, events.lines[shared.front()]));
  }
  for (std::size_t row = 0; row < events.rows.size(); ++row) {
    if (!owner[row]) continue;
    try {
      chosen.push_back({row, events.number(row, onset), *owner[row]});
    } catch (const InputError& error) {
      problems.emplace_back(error.what());
    }
  }
  if (!problems.empty()) throw InputError(problem_list(events.source, problems));
  std::stable_sort(chosen.begin(), chosen.end(),
                   [](const auto& a, const auto& b) { return a.onset_s < b.onset_s; });
  const auto twice = std::adjacent_find(
      chosen.begin(), chosen.end(),
      [](const auto& a, const auto& b) { return a.onset_s == b.onset_s && a.place == b.place; });
  if (twice != chosen.end())
    throw InputError(fmt::format(
        "{}: two events of condition '{}' begin at {:g} s (lines {} and {}): a trial would count "
        "twice. Remove one of each such pair.",
        events.source, choices[twice->place].condition, twice->onset_s, events.lines[twice->row],
        events.lines[(twice + 1)->row]));
  return chosen;
}

}  // namespace headwater
