// SPDX-License-Identifier: GPL-3.0-or-later
// One recording with its BIDS side files: an EDF file, and beside it - under the same name with
// "_eeg.edf" replaced - _channels.tsv, _events.tsv and _eeg.json (one of a higher folder of the
// data set counts too, the nearest wins, of _eeg.json key by key: the inheritance principle of
// BIDS). Each is optional.
#pragma once
#include <headwater/base/edf.hpp>
#include <headwater/base/labels.hpp>
#include <headwater/base/table.hpp>

#include <Eigen/Core>

#include <filesystem>
#include <string>
#include <vector>

namespace headwater {

/// A channel of a recording.
struct RecordingChannel {
  std::string name;           ///< cleaned: clean_lead_name
  std::string type = "EEG";   ///< BIDS type, upper case; where _channels.tsv says nothing, EEG,
                              ///< or what the label begins with ("EOG left")
  double volts_per_unit = 0;  ///< of the header's physical unit
  double sampling_Hz = 0;
  std::string set_aside;  ///< why it is no lead of the analysis ("type EOG", "marked bad: ...");
                          ///< empty: it is one
};

/// Samples without a gap. Epochs do not cross from one into the next.
struct RecordingSegment {
  Eigen::Index first = 0, count = 0;  ///< samples, counted over records
  double onset_s = 0;                 ///< of the first sample, on the time axis of the events
};

/// "EEG Fp1-Ref" -> "Fp1", "Fc5." -> "Fc5", " Cz " -> "Cz": a leading "EEG ", trailing dots, and a
/// trailing "-Ref", "-Reference", "-LE", "-AV", "-Avg" (case ignored) are removed.
std::string clean_lead_name(std::string_view label);

class Recording {
 public:
  /// Channels of other types than EEG, marked bad, without voltage unit, or at another sampling
  /// rate than most EEG channels are set aside, with the reason. Units: uV (in any spelling: "uV",
  /// "µV", "microV"), mV, V, nV, from the header; where _channels.tsv states another voltage unit
  /// the header wins, since it carries the scaling, and a note says so; where the header has no
  /// unit that of _channels.tsv is taken, with a note. Values whose typical size
  /// (median over channels of the robust spread, 1.4826 MAD, over at most 12 s spread through the
  /// recording) is far from EEG's (0.5 to 500 uV) cause a note naming the unit that would fit; they
  /// are not rescaled. Errors (InputError): those of EdfFile and of the tables; names repeated
  /// after cleaning; names of _channels.tsv that are not in the recording and the reverse (all
  /// listed). Labels that a writer has run together from a numbered list ("0", "Fp1", "1", "Fp2",
  /// ...) stand at the wrong signals: where _channels.tsv confirms the list, its rows name the
  /// signals in their order, and a note says so, as where all labels only count; otherwise an
  /// error. Further errors: a SamplingFrequency that differs from the header's; no EEG channel.
  explicit Recording(const std::filesystem::path& edf);

  const std::string& source() const { return source_; }
  const std::vector<RecordingChannel>& channels() const { return channels_; }
  Labels used_names() const;  ///< of channels not set aside
  double sampling_Hz() const { return sampling_Hz_; }
  /// Gap-free pieces; with RecordingType "epoched" and an EpochLength, each epoch is one.
  const std::vector<RecordingSegment>& segments() const { return segments_; }
  /// Columns onset, duration, then those of _events.tsv; or onset, duration, trial_type from EDF+
  /// annotations where there is no such file. `source` names the file. No rows: none of the two.
  const Table& events() const { return events_; }
  const std::string& stated_reference() const { return reference_; }  ///< EEGReference or ""
  const Labels& notes() const { return notes_; }
  const std::vector<std::filesystem::path>& files() const { return files_; }

  /// Samples [first, first + count) of a channel in V to out[0], out[stride], ... Throws
  /// std::logic_error outside the recording, or of a channel without voltage unit.
  void read(std::size_t channel, Eigen::Index first, Eigen::Index count, double* out,
            Eigen::Index stride = 1) const;

 private:
  void read_side_facts();  // _eeg.json; then segments_
  void check_size();       // of the values, against their unit

  std::string source_;
  EdfFile edf_;
  std::vector<RecordingChannel> channels_;
  double sampling_Hz_ = 0;
  std::vector<RecordingSegment> segments_;
  Table events_;
  std::string reference_;
  Labels notes_;
  std::vector<std::filesystem::path> files_;
};

/// The side file of a recording: the nearest that BIDS' inheritance principle allows, or empty.
/// `suffix`: "channels.tsv", "events.tsv", "eeg.json", "electrodes.tsv", "coordsystem.json"; the
/// last two may also have a part "space-..." in their name. Throws InputError where two files of
/// one folder fit equally well.
std::filesystem::path side_file(const std::filesystem::path& recording, const std::string& suffix);

}  // namespace headwater
