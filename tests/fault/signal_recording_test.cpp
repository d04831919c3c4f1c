// SPDX-License-Identifier: GPL-3.0-or-later
// Recordings whose side files are wrong or contradict the recording.
#include "base_scratch.hpp"
#include "edf_support.hpp"

#include <headwater/base/error.hpp>
#include <headwater/signal/recording.hpp>

#include <gtest/gtest.h>

namespace headwater {
namespace {

/// Three channels, 4 Hz, 2 s; side files by suffix.
struct Wrong : Scratch {
  MadeEdf made;
  Wrong() {
    made.signals.assign(3, MadeSignal{});
    made.signals[0].label = "EEG Fz-Ref";
    made.signals[1].label = "Cz.";
    made.signals[2].label = "Pz";
    made.data.assign(2, edf_samples({1, 2, 3, 4, 1, 2, 3, 4, 1, 2, 3, 4}));
  }
  void side(const std::string& suffix, const std::string& text) const {
    write_file(folder / ("a_" + suffix), text);
  }
  void refused(const std::vector<std::string>& parts) const {
    const auto path = made.write(folder / "a_eeg.edf");
    const std::string message = message_of<InputError>([&] { Recording{path}; });
    for (const auto& part : parts) EXPECT_NE(message.find(part), std::string::npos) << message;
  }
};

TEST(SignalRecordingFault, NamesRepeatedAfterCleaning) {
  Wrong wrong;
  wrong.made.signals[1].label = "FZ..";
  wrong.made.signals[2].label = "";
  wrong.refused({"a_eeg.edf: 2 problems", "several channels are named FZ: 'EEG Fz-Ref' and 'FZ..'",
                 "signal 3 has no label"});
}

TEST(SignalRecordingFault, NamesThatDoNotMeet) {
  const Wrong wrong;
  wrong.side("channels.tsv", "name\ttype\nFz\tEEG\nfz\tEEG\nC1\tEEG\nC2\tEEG\n");
  wrong.refused({"a_channels.tsv: 3 problems", "listed more than once: fz", "not listed: Cz and Pz",
                 "names that are not in", "C1 and C2"});
}

TEST(SignalRecordingFault, LabelsRunTogetherFromANumberedListWithoutATableThatConfirmsIt) {
  Wrong wrong;
  wrong.made.signals.assign(4, MadeSignal{});
  const char* labels[] = {"0", "Fz", "1", "Cz"};
  for (std::size_t i = 0; i < 4; ++i) wrong.made.signals[i].label = labels[i];
  wrong.made.data.assign(2, edf_samples({1, 2, 3, 4, 1, 2, 3, 4, 1, 2, 3, 4, 1, 2, 3, 4}));
  const std::string message = "a numbered list run together ('0', 'Fz', '1', 'Cz', ...)";
  wrong.refused({message, "_channels.tsv"});
  wrong.side("channels.tsv", "name\nCz\nFz\nPz\nOz\n");  // another order
  wrong.refused({message});
  wrong.side("channels.tsv", "name\nFz\nCz\nPz\n");  // too few
  wrong.refused({message});
}

TEST(SignalRecordingFault, OneNumberAmongNamesDoesNotReorderThem) {
  Wrong wrong;
  wrong.made.signals[2].label = "7";
  wrong.side("channels.tsv", "name\nCz\nFz\nPz\n");
  wrong.refused({"not listed: 7", "Pz"});
}

TEST(SignalRecordingFault, TablesThatAreNone) {
  const Wrong wrong;
  wrong.side("channels.tsv", "name\ttype\n");
  wrong.refused({"a_channels.tsv", "no rows"});
  wrong.side("channels.tsv", "");
  wrong.refused({"a_channels.tsv", "line 1 is empty"});
  wrong.side("channels.tsv", "nam\ttype\nFz\tEEG\n");
  wrong.refused({"a_channels.tsv", "no column 'name'"});
  wrong.side("channels.tsv", "name\ttype\nFz\tEEG\tgood\n");
  wrong.refused({"a_channels.tsv, line 2", "3 cells found, 2 expected"});
  wrong.side("channels.tsv", "name\tsampling_frequency\nFz\t4\nCz\tfour\nPz\t4\n");
  wrong.refused({"a_channels.tsv, line 3", "'four'"});
  std::filesystem::remove(wrong.folder / "a_channels.tsv");
  wrong.side("events.tsv", "onset\tduration\n");
  wrong.refused({"a_events.tsv", "no rows"});
  wrong.side("events.tsv", "time\tduration\n1\t2\n");
  wrong.refused({"a_events.tsv", "no column 'onset'"});
}

TEST(SignalRecordingFault, SideFactsThatContradict) {
  const Wrong wrong;
  wrong.side("eeg.json", "{\"SamplingFrequency\": 5}");
  wrong.refused({"a_eeg.json: SamplingFrequency is 5 Hz", "is sampled at 4 Hz"});
  wrong.side("eeg.json", "{\"SamplingFrequency\": \"fast\"}");
  wrong.refused({"a_eeg.json: SamplingFrequency: expected a number above 0"});
  wrong.side("eeg.json", "{\"EpochLength\": -1}");
  wrong.refused({"EpochLength: expected a number above 0"});
  wrong.side("eeg.json", "{\"RecordingType\": \"epoched\", \"EpochLength\": 0.3}");
  wrong.refused({"EpochLength 0.3 s is 1.2 samples at 4 Hz"});
  wrong.side("eeg.json", "{\"RecordingType\": \"epoched\", \"EpochLength\": 3}");
  wrong.refused({"EpochLength 3 s is longer than"});
  wrong.side("eeg.json", "{\"RecordingType\": \"epoched\", \"EpochLength\": 1e300}");
  wrong.refused({"longer than"});
  wrong.side("eeg.json", "{\"RecordingType\"");
  wrong.refused({"a_eeg.json, line 1"});
}

TEST(SignalRecordingFault, NoChannelIsLeft) {
  Wrong wrong;
  wrong.made.signals[0].unit = "degC";
  wrong.side("channels.tsv", "name\ttype\tstatus\nFz\tEEG\tgood\nCz\tEOG\tgood\nPz\tEEG\tbad\n");
  wrong.refused({"no EEG channel is left", "Fz (unit 'degC' is no voltage)", "Cz (type EOG)",
                 "Pz (marked bad)"});
}

TEST(SignalRecordingFault, ErrorsOfTheFileItselfPass) {
  Wrong wrong;
  wrong.made.records = "7";
  wrong.refused({"7 announced, but the file holds 2"});
}

}  // namespace
}  // namespace headwater
