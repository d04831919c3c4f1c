// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/app/begin.hpp>
#include <headwater/app/experiment_file.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/json.hpp>
#include <headwater/base/table.hpp>
#include <headwater/signal/recording.hpp>
#include <headwater/signal/standard_cap.hpp>

#include <fmt/core.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <map>
#include <set>

namespace headwater {
namespace {

namespace fs = std::filesystem;

/// The recordings of one kind: same path but for the participant.
struct RecordingSet {
  std::string pattern;  // relative to the folder, with {participant}
  std::map<std::string, fs::path> of_participant;
};

/// "sub-01" of a path's file name or folders, or "".
std::string participant_of(const fs::path& relative) {
  for (const auto& part : relative) {
    const std::string text = part.string();
    if (!text.starts_with("sub-")) continue;
    return text.substr(0, text.find_first_of("_."));
  }
  return "";
}

std::vector<RecordingSet> find_recordings(const fs::path& folder) {
  std::error_code failure;
  if (!fs::is_directory(folder, failure))
    throw InputError(
        fmt::format("{} is no folder: give the folder of a BIDS data set.", folder.string()));
  std::map<std::string, RecordingSet> sets;
  for (auto entry = fs::recursive_directory_iterator(
           folder, fs::directory_options::skip_permission_denied, failure);
       entry != fs::recursive_directory_iterator(); entry.increment(failure)) {
    if (failure || fold_case(entry->path().extension().string()) != ".edf") continue;
    const fs::path relative = entry->path().lexically_relative(folder);
    if (*relative.begin() == "derivatives") continue;
    const std::string participant = participant_of(relative);
    if (participant.empty()) continue;
    const std::string pattern = general_text(relative.generic_string(), participant);
    sets[pattern].pattern = pattern;
    sets[pattern].of_participant[participant] = entry->path();
  }
  std::vector<RecordingSet> found;
  for (auto& [pattern, set] : sets) found.push_back(std::move(set));
  std::stable_sort(found.begin(), found.end(), [](const auto& a, const auto& b) {
    return a.of_participant.size() > b.of_participant.size();
  });
  if (found.empty())
    throw InputError(
        fmt::format("{}: no recording found. Looked below it for EDF files of participants: "
                    "sub-<name>/eeg/sub-<name>_task-<task>_eeg.edf.",
                    folder.string()));
  return found;
}

std::string in_quotes(const std::string& text) {
  std::string result = "\"";
  for (const char letter : text) {
    if (letter == '"' || letter == '\\') result += '\\';
    result += letter;
  }
  return result + '"';
}

std::string listed(const Labels& labels) {
  Labels parts;
  for (const auto& label : labels) parts.push_back(in_quotes(label));
  return fmt::format("[{}]", fmt::join(parts, ", "));
}

/// Events over all participants: how often each trial type, and which columns hold numbers.
struct EventSummary {
  std::vector<std::pair<std::string, int>> types;  // most frequent first
  Labels number_columns;
  std::set<std::string> lacking;  // participants without events
};

EventSummary summarise_events(const RecordingSet& set, const Recording& first) {
  EventSummary summary;
  std::map<std::string, int> counts;
  for (const auto& [participant, path] : set.of_participant) {
    const fs::path file = side_file(path, "events.tsv");
    const Table events = file.empty() ? Recording(path).events() : read_table(file, "events");
    const auto type = events.find_column("trial_type");
    if (!type || events.rows.empty()) {
      summary.lacking.insert(participant);
      continue;
    }
    for (const auto& row : events.rows)
      if (row[*type] != "n/a") ++counts[row[*type]];
  }
  summary.types.assign(counts.begin(), counts.end());
  std::stable_sort(summary.types.begin(), summary.types.end(),
                   [](const auto& a, const auto& b) { return a.second > b.second; });
  const Table& events = first.events();
  for (std::size_t column = 0; column < events.columns.size(); ++column) {
    const auto& name = events.columns[column];
    if (name == "onset" || name == "duration" || name == "sample" || name == "trial_type") continue;
    std::set<double> values;
    try {
      for (std::size_t row = 0; row < events.rows.size(); ++row)
        if (const auto value = events.optional_number(row, column)) values.insert(*value);
    } catch (const Error&) {
      continue;
    }
    if (values.size() > 2) summary.number_columns.push_back(name);
  }
  return summary;
}

/// The single site that the side file names as reference, as a lead of zeros; or "".
std::string reference_site(const Recording& recording) {
  const std::string name = standard_name(clean_lead_name(recording.stated_reference()));
  if (name.empty()) return "";
  return find_label_any_case(recording.used_names(), name) ? "" : name;
}

std::string participants_section(const fs::path& folder, const std::string& start,
                                 const RecordingSet& set, std::string& note) {
  const fs::path table = folder / "participants.tsv";
  if (!fs::exists(table))
    return "# Without a participants table, people are found by the recordings.\n\n";
  Labels without;
  const Table list = read_table(table, "participants table");
  const auto column = list.find_column("participant_id");
  if (!column) return "";
  for (const auto& row : list.rows)
    if (!set.of_participant.contains(row[*column])) without.push_back(row[*column]);
  if (!without.empty()) note += fmt::format("Without a recording: {}.\n", join_labels(without));
  return fmt::format("[participants]\ntable = {}\n{}\n", in_quotes(start + "participants.tsv"),
                     without.empty()
                         ? ""
                         : fmt::format("leave_out = {}   # no such recording\n", listed(without)));
}

std::string trials_section(const Recording& recording, const std::string& pattern) {
  const auto& segments = recording.segments();
  double shortest = segments[0].count > 0 ? static_cast<double>(segments[0].count) : 0;
  for (const auto& segment : segments)
    shortest = std::min(shortest, static_cast<double>(segment.count));
  std::string text = fmt::format("[trials]\nrecording = {}\n", in_quotes(pattern));
  if (segments.size() > 1 && shortest / recording.sampling_Hz() < 5) {
    const double last_ms = std::floor(1000 * (shortest - 1) / recording.sampling_Hz());
    text += fmt::format(
        "# The recording is cut into pieces of {:g} ms: no baseline before the event is assumed.\n"
        "from_ms = 0\nto_ms = {:g}\n",
        1000 * shortest / recording.sampling_Hz(), last_ms);
  } else {
    text += "from_ms = -100\nto_ms = 600\nbaseline_ms = [-100, 0]\n";
  }
  return text +
         "reject_uV = 100             # a trial goes where a good lead exceeds this\n"
         "# low_pass_Hz = 40          # zero phase; high_pass_Hz, drift_degree, decimate: see "
         "`headwater "
         "keys trials`\n\n";
}

std::string montage_section(const Recording& recording, const std::string& start,
                            const fs::path& edf, const fs::path& folder, std::string& note) {
  std::string text = "[montage]\n";
  const fs::path electrodes = side_file(edf, "electrodes.tsv");
  Labels unknown;
  for (const auto& name : recording.used_names())
    if (!standard_direction(name)) unknown.push_back(name);
  if (!electrodes.empty()) {
    const std::string path = general_text(electrodes.lexically_relative(folder).generic_string(),
                                          participant_of(edf.lexically_relative(folder)));
    text += fmt::format("positions = {}\nspace = \"own\"               # fitted to the head\n",
                        in_quotes(start + path));
  } else {
    text += "positions = \"standard\"      # by the names of the 10-20, 10-10 and 10-5 systems\n";
    if (!unknown.empty()) {
      text +=
          fmt::format("drop = {}   # names without a standard place: rename them if you know it\n",
                      listed(unknown));
      note += fmt::format("Left out, no standard place: {}.\n", join_labels(unknown));
    }
  }
  for (const auto& channel : recording.channels())
    if (!channel.set_aside.empty())
      text += fmt::format("# {} is no lead of the analysis: {}\n", channel.name, channel.set_aside);
  const std::string reference = reference_site(recording);
  if (!reference.empty())
    text += fmt::format("zero = [{}]                # the recording reference, restored\n",
                        in_quotes(reference));
  else
    text += fmt::format(
        "# zero = [\"FCz\"]            # the recording reference, where it is a site of its own "
        "(stated: "
        "{})\n",
        recording.stated_reference().empty() ? "nothing" : recording.stated_reference());
  return text + "\n";
}

std::string conditions_section(const EventSummary& events) {
  std::string text =
      "# Conditions: events by their trial_type. Any other key is a factor of the design.\n";
  std::size_t shown = 0;
  for (const auto& [type, count] : events.types) {
    const bool active = shown++ < 8;
    text += fmt::format("{0}[[conditions]]\n{0}name = {1}   # {2} events in all\n\n",
                        active ? "" : "# ", in_quotes(type), count);
  }
  if (events.types.size() >= 2) {
    const auto& often = events.types.front().first;
    const auto& seldom = events.types[std::min<std::size_t>(events.types.size(), 8) - 1].first;
    text += fmt::format(
        "# The rarest minus the most frequent: change it to what you ask.\n[[contrasts]]\nname = "
        "{}\n"
        "weights = {{ {} = 1, {} = -1 }}\n\n",
        in_quotes(seldom + " minus " + often), in_quotes(seldom), in_quotes(often));
  }
  if (!events.number_columns.empty()) {
    const auto& column = events.number_columns.front();
    text += fmt::format(
        "# Columns of numbers in the events: {}. To regress single trials on one, or on the "
        "surprise\n"
        "# of an ideal observer who follows it:\n"
        "# [observer]\n# value = {}\n# [regression]\n# predictors = [\"surprise\"]\n"
        "# [[contrasts]]\n# name = \"surprise\"\n# predictor = \"surprise\"\n\n",
        fmt::join(events.number_columns, ", "), in_quotes(column));
  }
  return text;
}

}  // namespace

BegunExperiment begin_experiment(const fs::path& folder, const fs::path& file) {
  const auto sets = find_recordings(fs::absolute(folder).lexically_normal());
  const fs::path root = fs::absolute(folder).lexically_normal();
  const RecordingSet& set = sets.front();
  const fs::path& edf = set.of_participant.begin()->second;
  const Recording recording(edf);
  const EventSummary events = summarise_events(set, recording);
  if (events.types.empty())
    throw InputError(fmt::format(
        "{}: no events with a trial_type: neither _events.tsv nor EDF+ annotations. Expected a "
        "table onset, duration, trial_type beside each recording.",
        edf.string()));
  const fs::path here = fs::absolute(file).lexically_normal().parent_path();
  std::string start = root.lexically_relative(here).generic_string();
  if (start.starts_with("../..")) start = root.generic_string();
  start = start.empty() || start == "." ? "" : start + "/";

  std::string title = root.filename().string();
  if (const fs::path description = root / "dataset_description.json"; fs::exists(description))
    if (const Json json = read_json(description, "description");
        const auto* name = json.find("Name"))
      title = name->text();
  BegunExperiment begun;
  std::string note;
  Labels others;
  for (std::size_t k = 1; k < sets.size() && k < 6; ++k)
    others.push_back(
        fmt::format("{} ({})", start + sets[k].pattern, sets[k].of_participant.size()));
  begun.text = fmt::format(
      "# Written by `headwater begin` from what the folder holds. Read it through, change what is\n"
      "# not meant so, then: headwater inspect {0}\n# `headwater keys` explains every key. Paths "
      "are "
      "relative to this file.\n\ntitle = {1}\noutput = \"results\"\n\n",
      file.filename().string(), in_quotes(title));
  begun.text += participants_section(root, start, set, note);
  if (!others.empty()) {
    note += fmt::format("Other recordings, not used (choose by trials.recording):\n  {}\n",
                        fmt::join(others, "\n  "));
    begun.text += fmt::format("# Other recordings in the folder, not used:\n#   {}\n",
                              fmt::join(others, "\n#   "));
  }
  begun.text += trials_section(recording, start + set.pattern);
  begun.text += montage_section(recording, start, edf, root, note);
  begun.text += conditions_section(events);
  begun.text +=
      "# When to look. 100 to 250 ms is customary for mismatch responses.\n[[windows]]\nname = "
      "\"mismatch\"\nfrom_ms = 100\nto_ms = 250\n";
  if (!events.lacking.empty())
    note += fmt::format("Without events: {}.\n",
                        join_labels({events.lacking.begin(), events.lacking.end()}));
  for (const auto& remark : recording.notes()) note += remark + "\n";
  begun.summary = fmt::format(
      "{} participant{} with {}; {} channels at {:g} Hz; {} trial types.\n{}",
      set.of_participant.size(), set.of_participant.size() == 1 ? "" : "s", set.pattern,
      recording.used_names().size(), recording.sampling_Hz(), events.types.size(), note);
  return begun;
}

}  // namespace headwater
