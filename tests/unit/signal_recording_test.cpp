// SPDX-License-Identifier: GPL-3.0-or-later
#include "base_scratch.hpp"
#include "edf_support.hpp"

#include <headwater/base/edf_writing.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/random.hpp>
#include <headwater/signal/recording.hpp>

#include <fmt/core.h>
#include <gtest/gtest.h>

#include <limits>

namespace headwater {
namespace {

constexpr double kNone = std::numeric_limits<double>::quiet_NaN();

/// Four channels of 20 uV noise, 4 s at 100 Hz, in a small data set.
struct SmallSet : Scratch {
  std::filesystem::path root = folder / "set";
  std::filesystem::path edf = root / "sub-01/eeg/sub-01_task-beat_eeg.edf";
  Eigen::MatrixXd data_uV;

  explicit SmallSet(const std::vector<EdfAnnotation>& annotations = {}) {
    RandomStream random(3, "recording");
    data_uV = 20 * random.normal_matrix(4, 400);
    write_edf(edf, {"EEG Fz-Ref", "Cz..", "EEG Pz", "X"}, 100, data_uV, annotations);
    side("../../dataset_description", "json", "{}");
  }
  void side(const std::string& suffix, const std::string& type, const std::string& text) const {
    const bool root_file = suffix.rfind("../", 0) == 0;
    write_file(
        edf.parent_path() / ((root_file ? suffix : "sub-01_task-beat_" + suffix) + "." + type),
        text);
  }
};

TEST(SignalRecording, CleansLeadNames) {
  EXPECT_EQ(clean_lead_name("EEG Fp1-Ref"), "Fp1");
  EXPECT_EQ(clean_lead_name("Fc5."), "Fc5");
  EXPECT_EQ(clean_lead_name(" Cz.. "), "Cz");
  EXPECT_EQ(clean_lead_name("eeg T3-LE"), "T3");
  EXPECT_EQ(clean_lead_name("EEG C3-AV."), "C3");
  EXPECT_EQ(clean_lead_name("O1-reference"), "O1");
  EXPECT_EQ(clean_lead_name("O2-Avg"), "O2");
  EXPECT_EQ(clean_lead_name("EEG"), "EEG");
  EXPECT_EQ(clean_lead_name("."), ".");
  EXPECT_EQ(clean_lead_name("Fp1-F7"), "Fp1-F7");
  EXPECT_EQ(clean_lead_name(""), "");
}

TEST(SignalRecording, WithoutSideFilesEverythingIsEegInVolts) {
  const SmallSet set;
  const Recording recording(set.edf);
  EXPECT_EQ(recording.used_names(), (Labels{"Fz", "Cz", "Pz", "X"}));
  EXPECT_EQ(recording.sampling_Hz(), 100);
  EXPECT_EQ(recording.source(), set.edf.string());
  EXPECT_EQ(recording.files(), (std::vector<std::filesystem::path>{set.edf}));
  EXPECT_TRUE(recording.notes().empty()) << recording.notes()[0];
  EXPECT_TRUE(recording.events().rows.empty());
  EXPECT_EQ(recording.stated_reference(), "");
  ASSERT_EQ(recording.segments().size(), 1u);
  EXPECT_EQ(recording.segments()[0].count, 400);
  Eigen::MatrixXd epoch_V(4, 50);
  for (std::size_t c = 0; c < 4; ++c) recording.read(c, 120, 50, epoch_V.data() + c, 4);
  const double step_V = 1e-6 * std::ceil(set.data_uV.cwiseAbs().maxCoeff()) / 32767;
  EXPECT_LE((epoch_V - 1e-6 * set.data_uV.middleCols(120, 50)).cwiseAbs().maxCoeff(),
            0.5 * step_V * (1 + 1e-9));
}

TEST(SignalRecording, ChannelsAreJoinedByNameAndSetAside) {
  const SmallSet set;
  set.side("channels", "tsv",
           "\xef\xbb\xbfname\ttype\tunits\tstatus\tstatus_description\n"
           "X\teog\tuV\tgood\tn/a\nCz\tEEG\tmicroV\tbad\tloose\nFz\tEEG\tuV\tn/a\tn/a\n"
           "Pz\tn/a\tn/a\tgood\tn/a\nEDF Annotations\tn/a\tn/a\tn/a\tn/a\n");
  const Recording recording(set.edf);
  EXPECT_EQ(recording.used_names(), (Labels{"Fz", "Pz"}));
  EXPECT_EQ(recording.channels()[1].set_aside, "marked bad: loose");
  EXPECT_EQ(recording.channels()[3].set_aside, "type EOG");
  EXPECT_TRUE(recording.notes().empty()) << recording.notes()[0];
}

TEST(SignalRecording, TheHeadersUnitWinsWithANote) {
  const SmallSet set;
  set.side("channels", "tsv",
           "name\ttype\tunits\nX\tEEG\tmV\nCz\tEEG\tmV\nFz\tEEG\tuV\nPz\tEEG\tuV\n");
  const Recording recording(set.edf);
  for (const auto& channel : recording.channels()) EXPECT_EQ(channel.volts_per_unit, 1e-6);
  ASSERT_EQ(recording.notes().size(), 1u);
  EXPECT_EQ(recording.notes()[0],
            "unit of Cz and X: the EDF header says uV and _channels.tsv says mV; the header's is "
            "used, since it carries the scaling.");
}

TEST(SignalRecording, UnitsInAnySpelling) {
  const Scratch scratch;
  const std::vector<std::pair<const char*, double>> spellings = {
      {"uV", 1e-6}, {"\xb5V", 1e-6}, {"\xc2\xb5V", 1e-6}, {"microV", 1e-6}, {"mV", 1e-3}, {"V", 1},
      {"Volt", 1},  {"nV", 1e-9},    {"UV", 1e-6},        {"MV", 0},        {"degC", 0},  {"", 0}};
  MadeEdf made;
  made.signals.clear();
  made.data = {""};
  for (std::size_t i = 0; i < spellings.size(); ++i) {
    made.signals.push_back(MadeSignal{});
    made.signals.back().label = fmt::format("E{}", i + 1);
    made.signals.back().unit = spellings[i].first;
    made.data[0] += edf_samples({1, 2, 3, 4});
  }
  const Recording recording(made.write(scratch.folder / "a.edf"));
  for (std::size_t i = 0; i < spellings.size(); ++i)
    EXPECT_EQ(recording.channels()[i].volts_per_unit, spellings[i].second) << spellings[i].first;
  EXPECT_EQ(recording.channels()[10].set_aside, "unit 'degC' is no voltage");
  EXPECT_EQ(recording.channels()[11].set_aside, "no unit");
  double out = 0;
  EXPECT_THROW(recording.read(10, 0, 1, &out), std::logic_error);
}

TEST(SignalRecording, ABlankUnitIsTakenFromTheSideFile) {
  const Scratch scratch;
  MadeEdf made;
  made.signals[0].unit = "";
  made.write(scratch.folder / "a.edf");
  write_file(scratch.folder / "a_channels.tsv", "name\tunits\nCz\tmV\n");
  const Recording recording(scratch.folder / "a.edf");
  EXPECT_EQ(recording.channels()[0].volts_per_unit, 1e-3);
  EXPECT_EQ(recording.notes().at(0).substr(0, 39), "unit of Cz: the EDF header says nothing");
}

TEST(SignalRecording, OtherSamplingRatesAreSetAside) {
  const Scratch scratch;
  MadeEdf made;
  made.signals = {MadeSignal{}, MadeSignal{}, MadeSignal{}, MadeSignal{}};
  const char* labels[] = {"Fz", "Cz", "Pz", "EOG left"};
  for (std::size_t i = 0; i < 4; ++i) made.signals[i].label = labels[i];
  made.signals[1].samples = "2";
  made.data = {edf_samples({1, 2, 3, 4, 5, 6, 1, 2, 3, 4, 1, 2, 3, 4})};
  const Recording recording(made.write(scratch.folder / "a.edf"));
  EXPECT_EQ(recording.sampling_Hz(), 4);
  EXPECT_EQ(recording.used_names(), (Labels{"Fz", "Pz"}));
  EXPECT_EQ(recording.channels()[1].set_aside, "sampled at 2 Hz, most EEG channels at 4 Hz");
  EXPECT_EQ(recording.channels()[3].set_aside, "type EOG");
}

TEST(SignalRecording, LabelsRunTogetherFromANumberedListAreMended) {
  const Scratch scratch;
  MadeEdf made;
  made.signals.assign(4, MadeSignal{});
  made.data = {""};
  const char* labels[] = {"0", "Fz", "1", "Cz"};
  for (int i = 0; i < 4; ++i) {
    made.signals[static_cast<std::size_t>(i)].label = labels[i];
    made.signals[static_cast<std::size_t>(i)].physical_min = "-32768";
    made.signals[static_cast<std::size_t>(i)].physical_max = "32767";
    made.data[0] += edf_samples({i, 10 + i, 20 + i, 30 + i});
  }
  made.write(scratch.folder / "a_eeg.edf");
  write_file(scratch.folder / "a_channels.tsv", "name\nFz\nCz\nPz\nOz\n");
  const Recording mended(scratch.folder / "a_eeg.edf");
  EXPECT_EQ(mended.used_names(), (Labels{"Fz", "Cz", "Pz", "Oz"}));
  EXPECT_NE(mended.notes().at(0).find("a numbered list run together"), std::string::npos);
  double value_V = 0;
  mended.read(1, 0, 1, &value_V);  // Cz is the second signal, not the one that bears its name
  EXPECT_NEAR(value_V, 1e-6, 1e-15);
  // Leads that are called so are left alone.
  write_file(scratch.folder / "a_channels.tsv", "name\n0\nFz\n1\nCz\n");
  EXPECT_EQ(Recording(scratch.folder / "a_eeg.edf").used_names(), (Labels{"0", "Fz", "1", "Cz"}));
}

TEST(SignalRecording, LabelsThatOnlyCountTakeTheNamesOfTheTable) {
  const Scratch scratch;
  MadeEdf made;
  made.signals.assign(2, MadeSignal{});
  made.signals[0].label = "1";
  made.signals[1].label = "2";
  made.data = {edf_samples({1, 2, 3, 4, 1, 2, 3, 4})};
  made.write(scratch.folder / "a_eeg.edf");
  EXPECT_EQ(Recording(scratch.folder / "a_eeg.edf").used_names(), (Labels{"1", "2"}));
  write_file(scratch.folder / "a_channels.tsv", "name\nFz\nCz\n");
  const Recording mended(scratch.folder / "a_eeg.edf");
  EXPECT_EQ(mended.used_names(), (Labels{"Fz", "Cz"}));
  EXPECT_NE(mended.notes().at(0).find("only count"), std::string::npos);
}

/// Size of a recording's values, against its unit.
std::string size_note_of(double size, const char* unit) {
  const Scratch scratch;
  RandomStream random(9, "size");
  MadeEdf made;
  made.signals[0] = {"Cz", unit, "", "", "-32767", "32767", "400"};
  // 0.2 of the range: nothing is cut off.
  made.signals[0].physical_max = fmt::format("{:.4g}", 5 * size);
  made.signals[0].physical_min = fmt::format("{:.4g}", -5 * size);
  const Eigen::VectorXd noise = random.normal_matrix(400, 1);
  std::vector<int> digital;
  for (const double value : noise) digital.push_back(static_cast<int>(6553 * value));
  made.data = {edf_samples(digital)};
  const Recording recording(made.write(scratch.folder / "a.edf"));
  return recording.notes().empty() ? "" : recording.notes()[0];
}

TEST(SignalRecording, ValuesThatContradictTheirUnitAreNoticed) {
  EXPECT_EQ(size_note_of(20, "uV"), "");
  EXPECT_EQ(size_note_of(0.02, "mV"), "");
  EXPECT_EQ(size_note_of(300, "uV"), "");
  EXPECT_NE(size_note_of(2e-5, "uV").find("unit were V instead of uV"), std::string::npos);
  EXPECT_NE(size_note_of(20, "mV").find("unit were uV instead of mV"), std::string::npos);
  EXPECT_NE(size_note_of(20000, "uV").find("unit were nV instead of uV"), std::string::npos);
}

TEST(SignalRecording, ASlowDriftIsNoSize) {
  const Scratch scratch;
  RandomStream random(9, "drift");
  Eigen::MatrixXd data_uV = 10 * random.normal_matrix(1, 6000);
  data_uV += Eigen::RowVectorXd::LinSpaced(6000, 0, 5000);
  write_edf(scratch.folder / "a.edf", {"Cz"}, 100, data_uV, {});
  EXPECT_TRUE(Recording(scratch.folder / "a.edf").notes().empty());
}

TEST(SignalRecording, SegmentsSplitAtTheGapsOfEdfD) {
  const Scratch scratch;
  const Recording recording(
      made_edf_plus("EDF+D", {"+0", "+1", "+7.25", "+8.25"}).write(scratch.folder / "a.edf"));
  ASSERT_EQ(recording.segments().size(), 2u);
  EXPECT_EQ(recording.segments()[0].first, 0);
  EXPECT_EQ(recording.segments()[0].count, 8);
  EXPECT_EQ(recording.segments()[1].first, 8);
  EXPECT_EQ(recording.segments()[1].count, 8);
  EXPECT_EQ(recording.segments()[1].onset_s, 7.25);
}

TEST(SignalRecording, EpochsAreSegments) {
  const SmallSet set;
  set.side("eeg", "json",
           R"({"RecordingType": "epoched", "EpochLength": 1.5, "SamplingFrequency": 100,
               "EEGReference": "nose"})");
  const Recording recording(set.edf);
  ASSERT_EQ(recording.segments().size(), 2u);
  EXPECT_EQ(recording.segments()[1].first, 150);
  EXPECT_EQ(recording.segments()[1].count, 150);
  EXPECT_EQ(recording.segments()[1].onset_s, 1.5);
  EXPECT_EQ(recording.stated_reference(), "nose");
  ASSERT_EQ(recording.notes().size(), 1u);
  EXPECT_EQ(recording.notes()[0].substr(0, 18), "100 samples behind");
}

TEST(SignalRecording, EventsComeFromTheTableOrElseFromAnnotations) {
  const SmallSet set({{0.5, 0.25, "late beat"}, {2, kNone, "steady"}});
  {
    const Table events = Recording(set.edf).events();
    EXPECT_EQ(events.source, set.edf.string());
    EXPECT_EQ(events.columns, (Labels{"onset", "duration", "trial_type"}));
    ASSERT_EQ(events.rows.size(), 2u);
    EXPECT_EQ(events.rows[0], (Labels{"0.5", "0.25", "late beat"}));
    EXPECT_EQ(events.rows[1], (Labels{"2", "n/a", "steady"}));
  }
  set.side("events", "tsv", "trial_type\tonset\tvalue\nlate\t1.25\t3\n");
  const Recording recording(set.edf);
  EXPECT_EQ(recording.events().columns, (Labels{"onset", "duration", "trial_type", "value"}));
  ASSERT_EQ(recording.events().rows.size(), 1u);
  EXPECT_EQ(recording.events().rows[0], (Labels{"1.25", "n/a", "late", "3"}));
  EXPECT_EQ(recording.files().size(), 2u);
}

TEST(SignalRecording, ControlCharactersOfAnnotationsDoNotReachTables) {
  const Scratch scratch;
  const std::string list = std::string(
                               "+0.25\x14"
                               "late\tbeat\x14") +
                           std::string(1, '\0');
  const Recording recording(made_edf_plus("EDF+C", {"+0"}, {list}).write(scratch.folder / "a.edf"));
  EXPECT_EQ(recording.events().rows.at(0), (Labels{"0.25", "n/a", "late beat"}));
}

TEST(SignalRecording, SideFilesAreInherited) {
  const SmallSet set;
  EXPECT_EQ(side_file(set.edf, "eeg.json"), "");
  write_file(set.root / "task-other_eeg.json", "{}");
  write_file(set.folder / "eeg.json", "{}");  // outside the data set
  EXPECT_EQ(side_file(set.edf, "eeg.json"), "");
  write_file(set.root / "task-beat_eeg.json", R"({"EEGReference": "Cz", "SamplingFrequency": 1})");
  EXPECT_EQ(side_file(set.edf, "eeg.json"), set.root / "task-beat_eeg.json");
  set.side("eeg", "json", R"({"SamplingFrequency": 100, "EpochLength": "n/a"})");
  EXPECT_EQ(side_file(set.edf, "eeg.json"), set.edf.parent_path() / "sub-01_task-beat_eeg.json");
  // The nearest file wins key by key.
  EXPECT_EQ(Recording(set.edf).stated_reference(), "Cz");

  write_file(set.edf.parent_path() / "sub-01_space-CapTrak_electrodes.tsv", "name\n");
  EXPECT_EQ(side_file(set.edf, "electrodes.tsv").filename(), "sub-01_space-CapTrak_electrodes.tsv");
  write_file(set.edf.parent_path() / "sub-01_space-other_electrodes.tsv", "name\n");
  const std::string message = message_of<InputError>([&] { side_file(set.edf, "electrodes.tsv"); });
  EXPECT_NE(message.find("CapTrak"), std::string::npos) << message;
}

TEST(SignalRecording, SideFilesOfPlainNames) {
  const Scratch scratch;
  write_file(scratch.folder / "S1R3_events.tsv", "onset\n");
  write_file(scratch.folder / "S1R33_events.tsv", "onset\n");
  EXPECT_EQ(side_file(scratch.folder / "S1R3.edf", "events.tsv"),
            scratch.folder / "S1R3_events.tsv");
  EXPECT_EQ(side_file(scratch.folder / "S2R3.edf", "events.tsv"), "");
}

TEST(SignalRecording, CanBeMoved) {
  const SmallSet set;
  std::vector<Recording> recordings;
  recordings.emplace_back(set.edf);
  recordings.emplace_back(set.edf);
  double value = 0;
  recordings[0].read(0, 0, 1, &value);
  EXPECT_NE(value, 0);
}

}  // namespace
}  // namespace headwater
