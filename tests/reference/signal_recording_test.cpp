// SPDX-License-Identifier: GPL-3.0-or-later
// Real recordings, as their README describes them.
#include "signal_support.hpp"

#include <headwater/signal/recording.hpp>

#include <gtest/gtest.h>

namespace headwater {
namespace {

TEST(SignalRecording, PicturesHaveOneSegmentForEachTrial) {
  NEED_OPEN_DATA(folder, "pictures");
  int people = 0;
  for (const auto& person : std::filesystem::directory_iterator(folder)) {
    if (!person.is_directory()) continue;
    const std::string name = person.path().filename().string();
    const Recording recording(person.path() / "eeg" / (name + "_task-pictures_eeg.edf"));
    ++people;
    EXPECT_EQ(recording.sampling_Hz(), 256);
    EXPECT_EQ(recording.channels().size(), 64u);
    EXPECT_EQ(recording.used_names().size(), 60u);  // without CZ, X, Y and nd
    EXPECT_EQ(recording.stated_reference(), "Cz");
    EXPECT_EQ(recording.segments().size(), recording.events().rows.size());
    for (std::size_t i = 0; i < recording.segments().size(); ++i) {
      EXPECT_EQ(recording.segments()[i].count, 256);
      EXPECT_EQ(recording.segments()[i].onset_s, recording.events().number(i, 0));
    }
    const auto why_aside = [&](const char* lead) {
      for (const auto& channel : recording.channels())
        if (channel.name == lead) return channel.set_aside;
      return std::string("no such channel");
    };
    EXPECT_EQ(why_aside("CZ").rfind("marked bad: the recording reference is Cz", 0), 0u);
    EXPECT_EQ(why_aside("X"), "type EOG");
    EXPECT_EQ(why_aside("Y"), "type EOG");
    EXPECT_EQ(why_aside("nd"), "type MISC");
    EXPECT_EQ(why_aside("PO7"), "");
    // The labels in these headers are a numbered list run together.
    ASSERT_EQ(recording.notes().size(), 1u) << name;
    EXPECT_NE(recording.notes()[0].find("a numbered list run together"), std::string::npos);
    EXPECT_EQ(recording.files().size(), 4u);
  }
  EXPECT_EQ(people, 12);
}

// The published averages say which signal is which lead. In c337 none of the 20 trials `object` was
// left out of them (trials.tsv).
TEST(SignalRecording, SignalsOfPicturesAreTheLeadsOfTheAverages) {
  NEED_OPEN_DATA(folder, "pictures");
  const Recording recording(folder / "sub-c337/eeg/sub-c337_task-pictures_eeg.edf");
  const NumberTable average =
      read_number_table(open_data() / "pictures-averages/sub-c337_object.tsv", "average");
  const std::size_t type = recording.events().column("trial_type");
  std::vector<RecordingSegment> trials;
  for (std::size_t i = 0; i < recording.segments().size(); ++i)
    if (recording.events().rows[i][type] == "object") trials.push_back(recording.segments()[i]);
  ASSERT_EQ(trials.size(), 20u);
  for (std::size_t c = 0; c < recording.channels().size(); ++c) {
    Eigen::VectorXd sum_V = Eigen::VectorXd::Zero(256), trial_V(256);
    for (const auto& trial : trials) {
      recording.read(c, trial.first, 256, trial_V.data());
      sum_V += trial_V;
    }
    const auto column = find_label(average.columns, recording.channels()[c].name);
    ASSERT_TRUE(column) << recording.channels()[c].name;
    const Eigen::VectorXd difference_uV = 1e6 * sum_V / 20 - average.values.col(*column);
    // Half a step of the EDF file (314 uV / 65535) and half a unit of the table's last digit; the
    // source's own digits are 0.001 uV.
    EXPECT_LE(difference_uV.cwiseAbs().maxCoeff(), 0.5 * 314.0 / 65535 + 0.0005 + 0.0005)
        << recording.channels()[c].name;
  }
}

TEST(SignalRecording, FistsLoseTheirDots) {
  NEED_OPEN_DATA(folder, "fists");
  const Recording recording(folder / "S001R03.edf");
  EXPECT_EQ(recording.sampling_Hz(), 160);
  const Labels names = recording.used_names();
  EXPECT_EQ(names.size(), 64u);
  EXPECT_EQ(names.front(), "Fc5");
  EXPECT_TRUE(find_label(names, "Cz") && find_label(names, "Iz") && find_label(names, "T10"));
  EXPECT_EQ(recording.segments().size(), 1u);
  EXPECT_EQ(recording.events().source, (folder / "S001R03_events.tsv").string());
  EXPECT_TRUE(recording.notes().empty()) << recording.notes()[0];
}

}  // namespace
}  // namespace headwater
