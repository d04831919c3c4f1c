// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/recording_channels.hpp"
#include "signal/side_files.hpp"

#include <headwater/base/error.hpp>
#include <headwater/base/json.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/recording.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <optional>
#include <stdexcept>

namespace headwater {
namespace {

/// What _eeg.json says that matters here. A key that the nearest file lacks may stand in one above
/// it.
struct SideFacts {
  std::optional<double> sampling_Hz, epoch_s;
  std::string reference, type;
};

/// The text of a value; "" for "n/a" and for what is no text.
std::string text_of(const Json& value) {
  try {
    const std::string text = value.text();
    return fold_case(text) == "n/a" ? "" : text;
  } catch (const std::logic_error&) {
    return "";
  }
}

/// Nothing for null and "n/a".
std::optional<double> positive_number(const Json& value, const std::string& where,
                                      const char* key) {
  if (value.is_null()) return std::nullopt;
  try {
    if (value.number() > 0) return value.number();
  } catch (const std::logic_error&) {
    // Not a number: "n/a" is let pass below.
    try {
      if (fold_case(value.text()) == "n/a") return std::nullopt;
    } catch (const std::logic_error&) {
    }
  }
  throw InputError(fmt::format("{}: {}: expected a number above 0.", where, key));
}

SideFacts read_facts(const std::vector<std::filesystem::path>& files) {
  SideFacts facts;
  for (const auto& file : files) {
    const Json json = read_json(file, "side file of a recording");
    const std::string where = file.string();
    const auto* rate = json.find("SamplingFrequency");
    if (rate && !facts.sampling_Hz)
      facts.sampling_Hz = positive_number(*rate, where, "SamplingFrequency");
    const auto* epoch = json.find("EpochLength");
    if (epoch && !facts.epoch_s) facts.epoch_s = positive_number(*epoch, where, "EpochLength");
    const auto* reference = json.find("EEGReference");
    if (reference && facts.reference.empty()) facts.reference = text_of(*reference);
    const auto* type = json.find("RecordingType");
    if (type && facts.type.empty()) facts.type = fold_case(text_of(*type));
  }
  return facts;
}

/// Pieces of an EDF file between gaps, in samples of a signal with so many in each record.
std::vector<RecordingSegment> gap_free(const EdfFile& edf, std::int64_t samples_per_record) {
  const double duration = edf.record_duration_s();
  const double tolerance = 0.5 * duration / static_cast<double>(samples_per_record);
  const auto& onset = edf.record_onset_s();
  std::vector<RecordingSegment> segments;
  for (std::size_t r = 0; r < onset.size(); ++r) {
    if (r == 0 || (edf.kind() == EdfFile::Kind::discontinuous &&
                   onset[r] - onset[r - 1] > duration + tolerance))
      segments.push_back({static_cast<Eigen::Index>(r) * samples_per_record, 0, onset[r]});
    segments.back().count += samples_per_record;
  }
  return segments;
}

/// Each segment cut into epochs of equal length; what is left at a segment's end goes, with a note.
std::vector<RecordingSegment> cut_epochs(const std::vector<RecordingSegment>& segments,
                                         double sampling_Hz, double epoch_s,
                                         const std::string& where, Labels& notes) {
  const double samples = epoch_s * sampling_Hz;
  const double rounded = std::round(samples);
  if (rounded < 1 || std::abs(samples - rounded) > kRateTolerance * samples)
    throw InputError(fmt::format(
        "{}: EpochLength {} s is {} samples at {} Hz; a whole number of samples is expected.",
        where, epoch_s, samples, sampling_Hz));
  std::vector<RecordingSegment> epochs;
  double left = 0;
  for (const auto& segment : segments) {
    const double fit = std::floor(static_cast<double>(segment.count) / rounded);
    for (double k = 0; k < fit; ++k)
      epochs.push_back({segment.first + static_cast<Eigen::Index>(k * rounded),
                        static_cast<Eigen::Index>(rounded),
                        segment.onset_s + k * rounded / sampling_Hz});
    left += static_cast<double>(segment.count) - fit * rounded;
  }
  if (epochs.empty())
    throw InputError(
        fmt::format("{}: EpochLength {} s is longer than the recording.", where, epoch_s));
  if (left > 0)
    notes.push_back(
        fmt::format("{} samples behind the last whole epoch of {} s are left out.", left, epoch_s));
  return epochs;
}

/// Columns onset, duration, then the others.
Table events_in_order(const Table& table) {
  const std::size_t onset = table.column("onset");
  const auto duration = table.find_column("duration");
  Table events{table.source, {"onset", "duration"}, {}, table.lines};
  for (const auto& name : table.columns)
    if (name != "onset" && name != "duration") events.columns.push_back(name);
  for (const auto& row : table.rows) {
    std::vector<std::string> cells{row[onset], duration ? row[*duration] : "n/a"};
    for (std::size_t c = 0; c < row.size(); ++c)
      if (c != onset && c != duration) cells.push_back(row[c]);
    events.rows.push_back(std::move(cells));
  }
  return events;
}

/// Annotations of the file as events; "line" is the number of the annotation.
Table events_of_annotations(const std::string& source,
                            const std::vector<EdfAnnotation>& annotations) {
  Table events{source, {"onset", "duration", "trial_type"}, {}, {}};
  for (const auto& annotation : annotations) {
    std::string text = annotation.text;
    for (char& c : text)
      if (static_cast<unsigned char>(c) < 0x20 || c == 0x7f) c = ' ';
    events.lines.push_back(static_cast<int>(events.rows.size()) + 1);
    events.rows.push_back(
        {fmt::format("{}", annotation.onset_s),
         std::isnan(annotation.duration_s) ? "n/a" : fmt::format("{}", annotation.duration_s),
         std::move(text)});
  }
  return events;
}

double median(std::vector<double>& values) {
  const auto middle = values.begin() + static_cast<std::ptrdiff_t>(values.size() / 2);
  std::nth_element(values.begin(), middle, values.end());
  return *middle;
}

/// 1.4826 MAD of a channel in V: deviations from the median of each second, so that slow drifts of
/// amplifiers without a high-pass count for nothing, over at most 12 seconds spread through the
/// recording: orders of magnitude are asked for, and opening must cost less than reading.
double robust_spread_V(const Recording& recording, std::size_t channel, Eigen::Index samples) {
  constexpr Eigen::Index kPieces = 12;
  const auto second = std::clamp<Eigen::Index>(std::lround(recording.sampling_Hz()), 1, samples);
  const Eigen::Index pieces = std::min(kPieces, samples / second);
  std::vector<double> piece(static_cast<std::size_t>(second)), deviations;
  deviations.reserve(static_cast<std::size_t>(pieces * second));
  for (Eigen::Index p = 0; p < pieces; ++p) {
    const Eigen::Index first = pieces == 1 ? 0 : (samples - second) / (pieces - 1) * p;
    recording.read(channel, first, second, piece.data());
    std::vector<double> sorted = piece;
    const double middle = median(sorted);
    for (const double value : piece) deviations.push_back(std::abs(value - middle));
  }
  return 1.4826 * median(deviations);
}

/// What is strange about values of this typical size, or nothing. volts_per_unit: of the unit that
/// the header states.
std::string size_note(double spread_V, double volts_per_unit) {
  constexpr double kLeast_V = 0.5 * kMicrovolt, kMost_V = 500 * kMicrovolt;
  if (spread_V >= kLeast_V && spread_V <= kMost_V) return "";
  if (spread_V == 0) return "most EEG channels are flat.";
  struct Unit {
    const char* name;
    double volts;
  };
  constexpr std::array<Unit, 4> kUnits = {{{"nV", 1e-9}, {"uV", 1e-6}, {"mV", 1e-3}, {"V", 1}}};
  std::string stated = "the stated one", fitting;
  for (const auto& [name, volts] : kUnits) {
    if (volts == volts_per_unit) stated = name;
    const double size_V = spread_V / volts_per_unit * volts;
    if (size_V >= kLeast_V && size_V <= kMost_V)
      fitting = fmt::format(" They would fit if their unit were {} instead of", name);
  }
  if (!fitting.empty()) fitting += " " + stated + ".";
  return fmt::format(
      "the values of the EEG channels are typically {:.3g} uV large; 0.5 to 500 uV "
      "is usual for EEG.{} They are used as the header states.",
      spread_V / kMicrovolt, fitting);
}

std::string where_of(const std::vector<std::filesystem::path>& json, const std::string& source) {
  return json.empty() ? source : json.front().string();
}

}  // namespace

Recording::Recording(const std::filesystem::path& edf) : source_(edf.string()), edf_(edf) {
  files_.push_back(edf);
  std::optional<Table> table;
  if (const auto file = side_file(edf, "channels.tsv"); !file.empty()) {
    table = read_table(file, "table of channels");
    files_.push_back(file);
  }
  channels_ = describe_channels(source_, edf_, table ? &*table : nullptr, notes_);
  sampling_Hz_ = set_aside_other_rates(channels_);
  if (sampling_Hz_ == 0) {
    Labels reasons;
    for (const auto& channel : channels_)
      reasons.push_back(fmt::format("{} ({})", channel.name, channel.set_aside));
    throw InputError(
        fmt::format("{}: no EEG channel is left. Set aside: {}.", source_, join_labels(reasons)));
  }
  read_side_facts();
  if (const auto file = side_file(edf, "events.tsv"); !file.empty()) {
    events_ = events_in_order(read_table(file, "table of events"));
    files_.push_back(file);
  } else {
    events_ = events_of_annotations(source_, edf_.annotations());
  }
  check_size();
}

void Recording::read_side_facts() {
  const auto files = side_files(source_, "eeg.json");
  files_.insert(files_.end(), files.begin(), files.end());
  const SideFacts facts = read_facts(files);
  reference_ = facts.reference;
  if (facts.sampling_Hz &&
      std::abs(*facts.sampling_Hz - sampling_Hz_) > kRateTolerance * sampling_Hz_)
    throw InputError(
        fmt::format("{}: SamplingFrequency is {} Hz, but {} is sampled at {} Hz. "
                    "Correct the side file.",
                    where_of(files, source_), *facts.sampling_Hz, source_, sampling_Hz_));
  segments_ = gap_free(edf_, std::llround(sampling_Hz_ * edf_.record_duration_s()));
  if (facts.type == "epoched" && facts.epoch_s)
    segments_ =
        cut_epochs(segments_, sampling_Hz_, *facts.epoch_s, where_of(files, source_), notes_);
  else if (facts.type == "epoched")
    notes_.push_back(
        "RecordingType is epoched, but no EpochLength is stated: it is read as one "
        "continuous recording.");
  if (facts.type == "discontinuous" && edf_.kind() != EdfFile::Kind::discontinuous)
    notes_.push_back(
        "RecordingType is discontinuous, but the EDF file marks no gaps (it is not "
        "EDF+D): it is read as one continuous recording.");
}

void Recording::check_size() {
  Eigen::Index samples = 0;
  for (const auto& segment : segments_) samples = std::max(samples, segment.first + segment.count);
  std::vector<double> spreads, units;
  for (std::size_t i = 0; i < channels_.size(); ++i)
    if (channels_[i].set_aside.empty()) {
      spreads.push_back(robust_spread_V(*this, i, samples));
      units.push_back(channels_[i].volts_per_unit);
    }
  const std::string note = size_note(median(spreads), median(units));
  if (!note.empty()) notes_.push_back(note);
}

Labels Recording::used_names() const {
  Labels names;
  for (const auto& channel : channels_)
    if (channel.set_aside.empty()) names.push_back(channel.name);
  return names;
}

void Recording::read(std::size_t channel, Eigen::Index first, Eigen::Index count, double* out,
                     Eigen::Index stride) const {
  const double volts = channels_.at(channel).volts_per_unit;
  if (volts == 0) throw std::logic_error("Recording::read of a channel without voltage unit");
  edf_.read(channel, first, count, volts, out, stride);
}

}  // namespace headwater
