// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/recording_channels.hpp"

#include "signal/problems.hpp"

#include <headwater/base/error.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <map>
#include <string_view>

namespace headwater {
namespace {

std::string_view without_blanks(std::string_view text) {
  while (!text.empty() && text.front() == ' ') text.remove_prefix(1);
  while (!text.empty() && text.back() == ' ') text.remove_suffix(1);
  return text;
}

bool ends_with_any_case(std::string_view text, std::string_view end) {
  return text.size() >= end.size() && fold_case(text.substr(text.size() - end.size())) == end;
}

/// A cell of _channels.tsv; "n/a", "" and a missing column give "".
std::string cell_of(const Table& table, std::size_t row, std::string_view column) {
  const auto found = table.find_column(column);
  if (!found) return "";
  const auto text = without_blanks(table.rows[row][*found]);
  return fold_case(text) == "n/a" ? "" : std::string(text);
}

std::string upper_case(std::string text) {
  for (char& c : text)
    if (c >= 'a' && c <= 'z') c = static_cast<char>(c - 'a' + 'A');
  return text;
}

/// EDF+ begins a label with the kind of signal ("EOG left"): what it says where no side file does.
std::string type_in_label(std::string_view label) {
  for (const std::string_view word : {"EOG", "ECG", "EMG", "ERG", "EKG"})
    if (label.size() > word.size() && label[word.size()] == ' ' &&
        upper_case(std::string(label.substr(0, word.size()))) == word)
      return std::string(word == "EKG" ? "ECG" : word);
  return "EEG";
}

/// Whether labels are a list of numbered names, (0, a), (1, b), ..., run together and cut to the
/// number of signals: "0", "a", "1", "b", ... A writer's slip that real files have; the labels are
/// then those of other signals.
bool are_numbered_pairs(const Labels& names) {
  if (names.size() < 4) return false;
  for (std::size_t i = 0; i < names.size(); i += 2)
    if (names[i] != std::to_string(i / 2)) return false;
  return true;
}

/// Whether every label is a bare number: what wrote the header counted and named nothing.
bool only_count(const Labels& names) {
  return std::all_of(names.begin(), names.end(), [](const std::string& name) {
    return !name.empty() && name.find_first_not_of("0123456789") == std::string::npos;
  });
}

/// Takes the names from the rows of the table, in their order, where the header's labels are known
/// to name nothing: the only place where rows are not joined by name. Numbered pairs themselves say
/// that signal k is called b_k; the table must say the same for each pair that is left, and then
/// also names the signals whose pairs were cut off. Any other label that is no number is believed.
void mend_labels(const std::string& source, const Table* table, Labels& names, Labels& notes) {
  const bool pairs = are_numbered_pairs(names);
  if (!pairs && !(table && only_count(names))) return;
  Labels rows;
  if (table)
    for (const auto& row : table->rows) rows.push_back(clean_lead_name(row[table->column("name")]));
  for (std::size_t i = 0; i < names.size(); i += pairs ? 2 : 1)
    if (find_label(rows, names[i])) return;  // a table that knows these names is believed
  bool agrees = rows.size() == names.size() && repeated_labels(rows).empty();
  if (pairs)
    for (std::size_t i = 1; agrees && i < names.size(); i += 2) agrees = rows[i / 2] == names[i];
  if (!agrees && pairs)
    throw InputError(fmt::format(
        "{}: the labels of its signals are a numbered list run together ('{}', '{}', '{}', '{}', "
        "...): they are not the names of the signals that they stand at. A _channels.tsv is needed "
        "whose rows name all {} signals in their order and agree with that list.",
        source, names[0], names[1], names[2], names[3], names.size()));
  if (!agrees) return;  // the usual message then lists what does not meet
  if (pairs)
    notes.push_back(fmt::format(
        "the labels of {} are a numbered list run together ('0', '{}', '1', '{}', ...): not the "
        "names of the signals that they stand at. The names are those of {}, in the order of its "
        "rows, which agrees with the part of the list that the header holds.",
        source, rows[0], rows[1], table->source));
  else
    notes.push_back(fmt::format(
        "the labels of {} only count ('{}', ...): the names of {} are used, in their order. Check "
        "one channel against what is known of it.",
        source, names[0], table->source));
  names = rows;
}

/// Row of _channels.tsv of each signal.
std::vector<std::size_t> join_rows(const std::string& source, const Labels& names,
                                   const Table& table) {
  const std::size_t column = table.column("name");
  Labels listed;
  std::vector<std::size_t> row_of;
  for (std::size_t row = 0; row < table.rows.size(); ++row) {
    const std::string name = clean_lead_name(table.rows[row][column]);
    if (name == "EDF Annotations") continue;  // no channel, though some tables list it
    listed.push_back(name);
    row_of.push_back(row);
  }
  std::vector<std::string> problems;
  const Labels repeated = repeated_labels(listed);
  if (!repeated.empty())
    problems.push_back("names listed more than once: " + join_labels(repeated));
  std::vector<std::size_t> rows;
  Labels missing, extra;
  for (const auto& name : names) {
    const auto found = find_label_any_case(listed, name);
    if (found)
      rows.push_back(row_of[static_cast<std::size_t>(*found)]);
    else
      missing.push_back(name);
  }
  for (const auto& name : listed)
    if (!find_label_any_case(names, name)) extra.push_back(name);
  if (!missing.empty())
    problems.push_back(
        fmt::format("channels of {} that are not listed: {}", source, join_labels(missing)));
  if (!extra.empty())
    problems.push_back(fmt::format("names that are not in {}: {}", source, join_labels(extra)));
  if (!problems.empty()) throw InputError(problem_list(table.source, problems));
  return rows;
}

/// The channel's unit: the header's, which carries the scaling, or the table's where the header has
/// none. Collects channels by what is to be noted.
void set_unit(const EdfSignal& signal, const std::string& listed, RecordingChannel& channel,
              std::map<std::string, Labels>& noted) {
  const auto of_header = volts_per_unit(signal.unit);
  const auto of_table = volts_per_unit(listed);
  if (of_header) {
    channel.volts_per_unit = *of_header;
    if (of_table && *of_table != *of_header)
      noted[fmt::format("the EDF header says {} and _channels.tsv says {}; the header's is used, "
                        "since it carries the scaling",
                        signal.unit, listed)]
          .push_back(channel.name);
  } else if (of_table && signal.unit.empty()) {
    channel.volts_per_unit = *of_table;
    noted[fmt::format("the EDF header says nothing; {} of _channels.tsv is used", listed)]
        .push_back(channel.name);
  }
}

void set_why_aside(const EdfSignal& signal, const std::string& status,
                   const std::string& description, RecordingChannel& channel) {
  if (fold_case(status) == "bad")
    channel.set_aside = description.empty() ? "marked bad" : "marked bad: " + description;
  else if (channel.type != "EEG")
    channel.set_aside = "type " + channel.type;
  else if (channel.volts_per_unit == 0)
    channel.set_aside =
        signal.unit.empty() ? "no unit" : fmt::format("unit '{}' is no voltage", signal.unit);
}

Labels checked_names(const std::string& source, const EdfFile& edf) {
  Labels names;
  std::vector<std::string> problems;
  for (const auto& signal : edf.signals()) {
    names.push_back(clean_lead_name(signal.label));
    if (names.back().empty())
      problems.push_back(fmt::format("signal {} has no label", names.size()));
  }
  for (const auto& name : repeated_labels(names)) {
    if (name.empty()) continue;
    Labels labels;
    for (std::size_t i = 0; i < names.size(); ++i)
      if (fold_case(names[i]) == fold_case(name))
        labels.push_back("'" + edf.signals()[i].label + "'");
    problems.push_back(fmt::format("several channels are named {}: {}", name, join_labels(labels)));
  }
  if (!problems.empty()) throw InputError(problem_list(source, problems));
  return names;
}

}  // namespace

std::string clean_lead_name(std::string_view label) {
  std::string_view name = without_blanks(label);
  if (name.size() > 4 && fold_case(name.substr(0, 4)) == "eeg ") name.remove_prefix(4);
  constexpr std::array<std::string_view, 6> kEndings = {".",   "-ref", "-reference",
                                                        "-le", "-av",  "-avg"};
  for (bool changed = true; changed;) {
    changed = false;
    name = without_blanks(name);
    for (const auto ending : kEndings)
      if (name.size() > ending.size() && ends_with_any_case(name, ending)) {
        name.remove_suffix(ending.size());
        changed = true;
      }
  }
  return std::string(name);
}

std::optional<double> volts_per_unit(std::string_view unit) {
  std::string text(without_blanks(unit));
  for (const std::string_view sign : {"\xc2\xb5", "\xce\xbc", "\xb5"})
    if (text.rfind(sign, 0) == 0) text.replace(0, sign.size(), "u");
  // "MV" might be anything: upper case is not taken for lower case there.
  if (text == "MV") return std::nullopt;
  text = fold_case(text);
  struct Spelling {
    std::string_view letters, word;
    double volts;
  };
  constexpr std::array<Spelling, 4> kUnits = {
      {{"v", "", 1}, {"mv", "milli", 1e-3}, {"uv", "micro", 1e-6}, {"nv", "nano", 1e-9}}};
  for (const auto& [letters, word, volts] : kUnits)
    if (text == letters || text == std::string(word) + "v" || text == std::string(word) + "volt" ||
        text == std::string(word) + "volts")
      return volts;
  return std::nullopt;
}

std::vector<RecordingChannel> describe_channels(const std::string& source, const EdfFile& edf,
                                                const Table* table, Labels& notes) {
  Labels names = checked_names(source, edf);
  mend_labels(source, table, names, notes);
  const std::vector<std::size_t> rows =
      table ? join_rows(source, names, *table) : std::vector<std::size_t>();
  std::vector<RecordingChannel> channels;
  std::map<std::string, Labels> unit_notes, rate_notes;
  for (std::size_t i = 0; i < names.size(); ++i) {
    const EdfSignal& signal = edf.signals()[i];
    const auto cell = [&](std::string_view column) {
      return table ? cell_of(*table, rows[i], column) : std::string();
    };
    RecordingChannel channel;
    channel.name = names[i];
    const std::string type = upper_case(cell("type"));
    channel.type = type.empty() ? type_in_label(signal.label) : type;
    channel.sampling_Hz = static_cast<double>(signal.samples_per_record) / edf.record_duration_s();
    set_unit(signal, cell("units"), channel, unit_notes);
    set_why_aside(signal, cell("status"), cell("status_description"), channel);
    if (!cell("sampling_frequency").empty()) {
      const double listed = table->number(rows[i], table->column("sampling_frequency"));
      if (std::abs(listed - channel.sampling_Hz) > kRateTolerance * channel.sampling_Hz)
        rate_notes[fmt::format("the EDF header says {} Hz and _channels.tsv {} Hz; the header's is "
                               "used",
                               channel.sampling_Hz, listed)]
            .push_back(channel.name);
    }
    channels.push_back(std::move(channel));
  }
  for (const auto& [text, whose] : unit_notes)
    notes.push_back(fmt::format("unit of {}: {}.", join_labels(whose), text));
  for (const auto& [text, whose] : rate_notes)
    notes.push_back(fmt::format("sampling rate of {}: {}.", join_labels(whose), text));
  return channels;
}

double set_aside_other_rates(std::vector<RecordingChannel>& channels) {
  std::map<double, int> count;
  for (const auto& channel : channels)
    if (channel.set_aside.empty()) ++count[channel.sampling_Hz];
  if (count.empty()) return 0;
  // Of equally frequent rates the higher one.
  const double rate =
      std::max_element(count.begin(), count.end(), [](const auto& a, const auto& b) {
        return a.second < b.second || (a.second == b.second && a.first < b.first);
      })->first;
  for (auto& channel : channels)
    if (channel.set_aside.empty() && channel.sampling_Hz != rate)
      channel.set_aside =
          fmt::format("sampled at {} Hz, most EEG channels at {} Hz", channel.sampling_Hz, rate);
  return rate;
}

}  // namespace headwater
