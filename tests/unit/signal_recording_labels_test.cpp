// SPDX-License-Identifier: GPL-3.0-or-later
// EDF headers whose labels are numbers instead of names (as in a published set: "0", "FP1", "1",
// "FP2", ...).
#include "base_scratch.hpp"
#include "edf_support.hpp"

#include <headwater/base/error.hpp>
#include <headwater/signal/recording.hpp>

#include <gtest/gtest.h>

namespace headwater {
namespace {

std::filesystem::path numbered(const std::filesystem::path& folder, const std::string& names) {
  MadeEdf made;
  made.signals = {MadeSignal{}, MadeSignal{}, MadeSignal{}, MadeSignal{}};
  const char* labels[] = {"0", "Fz", "1", "Cz"};
  for (std::size_t i = 0; i < 4; ++i) made.signals[i].label = labels[i];
  made.data = {edf_samples({1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12, 13, 14, 15, 16})};
  write_file(folder / "a_channels.tsv", "name\ttype\n" + names);
  return made.write(folder / "a.edf");
}

TEST(SignalRecordingLabels, NumbersGiveWayToTheTablesOrder) {
  const Scratch scratch;
  const Recording recording(numbered(scratch.folder, "Fz\tEEG\nCz\tEEG\nPz\tEOG\nOz\tEEG\n"));
  EXPECT_EQ(recording.used_names(), (Labels{"Fz", "Cz", "Oz"}));
  EXPECT_EQ(recording.channels()[2].set_aside, "type EOG");
  ASSERT_FALSE(recording.notes().empty());
  EXPECT_NE(recording.notes()[0].find("'0', 'Fz'"), std::string::npos) << recording.notes()[0];
  double first = 0, third = 0;
  recording.read(1, 0, 1, &first);  // Cz: the second signal, labelled Fz
  recording.read(2, 0, 1, &third);
  EXPECT_NEAR((third - first) / recording.channels()[1].volts_per_unit, 4 * 200.0 / 65535, 1e-9);
}

TEST(SignalRecordingLabels, NumbersThatTheTableListsAreNames) {
  const Scratch scratch;
  const Recording recording(numbered(scratch.folder, "Cz\tEEG\n1\tEEG\n0\tEOG\nFz\tEEG\n"));
  EXPECT_EQ(recording.used_names(), (Labels{"Fz", "1", "Cz"}));
}

TEST(SignalRecordingLabels, AnotherNumberOfChannelsIsAnError) {
  const Scratch scratch;
  const auto file = numbered(scratch.folder, "Fz\tEEG\nCz\tEEG\nPz\tEOG\n");
  EXPECT_NE(message_of<InputError>([&] { Recording recording(file); }).find("0 and 1"),
            std::string::npos);
}

}  // namespace
}  // namespace headwater
