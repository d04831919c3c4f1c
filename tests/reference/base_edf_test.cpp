// SPDX-License-Identifier: GPL-3.0-or-later
// Our reading of EDF beside that of EDFlib, of a plain reader written here, and of the examples in
// the published specification of EDF+ (Kemp & Olivan 2003; edfplus.info, "EDF+ specification").
#include "base_scratch.hpp"
#include "edf_support.hpp"
#include "signal_support.hpp"

#include <headwater/base/edf.hpp>
#include <headwater/base/edf_writing.hpp>

#include <edflib.h>
#include <gtest/gtest.h>

#include <cmath>
#include <fstream>
#include <limits>

namespace headwater {
namespace {

constexpr double kEps = std::numeric_limits<double>::epsilon();
constexpr double kNone = std::numeric_limits<double>::quiet_NaN();

std::vector<double> all_samples(const EdfFile& edf, std::size_t signal) {
  const auto count = edf.signals()[signal].samples_per_record * edf.records();
  std::vector<double> values(static_cast<std::size_t>(count));
  edf.read(signal, 0, count, 1, values.data());
  return values;
}

/// Every sample, label, unit, rate and annotation. EDFlib computes bit (max / bit - digital_max +
/// digital): each of its four roundings is at most half an eps of the range, as are our three.
void expect_as_edflib(const std::filesystem::path& path) {
  edf_hdr_struct header;
  ASSERT_EQ(edfopen_file_readonly(path.c_str(), &header, EDFLIB_READ_ALL_ANNOTATIONS), 0)
      << "EDFlib says " << header.filetype;
  const EdfFile edf(path);
  ASSERT_EQ(edf.signals().size(), static_cast<std::size_t>(header.edfsignals));
  EXPECT_EQ(edf.records(), header.datarecords_in_file);
  EXPECT_EQ(edf.record_duration_s(),
            static_cast<double>(header.datarecord_duration) / EDFLIB_TIME_DIMENSION);
  for (int s = 0; s < header.edfsignals; ++s) {
    const auto& theirs = header.signalparam[s];
    const auto& ours = edf.signals()[static_cast<std::size_t>(s)];
    EXPECT_EQ(edf_field(ours.label, 16), edf_field(theirs.label, 16));
    EXPECT_EQ(edf_field(ours.unit, 8), edf_field(theirs.physdimension, 8));
    EXPECT_EQ(ours.samples_per_record, theirs.smp_in_datarecord);
    const std::vector<double> read = all_samples(edf, static_cast<std::size_t>(s));
    std::vector<double> expected(read.size());
    ASSERT_EQ(theirs.smp_in_file, static_cast<long long>(read.size()));
    ASSERT_EQ(
        edfread_physical_samples(header.handle, s, static_cast<int>(read.size()), expected.data()),
        static_cast<int>(read.size()));
    const double range = std::max(std::abs(theirs.phys_min), std::abs(theirs.phys_max));
    double worst = 0;
    for (std::size_t i = 0; i < read.size(); ++i)
      worst = std::max(worst, std::abs(read[i] - expected[i]));
    EXPECT_LE(worst, 4 * kEps * range) << ours.label;
  }
  ASSERT_EQ(edf.annotations().size(), static_cast<std::size_t>(header.annotations_in_file));
  for (int n = 0; n < header.annotations_in_file; ++n) {
    edf_annotation_struct theirs;
    ASSERT_EQ(edf_get_annotation(header.handle, n, &theirs), 0);
    const auto& ours = edf.annotations()[static_cast<std::size_t>(n)];
    EXPECT_EQ(std::llround(ours.onset_s * EDFLIB_TIME_DIMENSION), theirs.onset);
    EXPECT_EQ(ours.text, theirs.annotation);
    const double none = -1;  // EDFlib's way to say that there is no duration
    EXPECT_EQ(std::llround((std::isnan(ours.duration_s) ? none : ours.duration_s) *
                           EDFLIB_TIME_DIMENSION),
              theirs.duration_l);
  }
  edfclose_file(header.handle);
}

TEST(BaseEdf, AgreesWithEdflibOnWhatEdflibWrote) {
  const Scratch scratch;
  RandomStream random(8, "edf reference");
  const Eigen::MatrixXd data_uV = 123 * random.normal_matrix(7, 5 * 250);
  write_edf(scratch.folder / "a.edf", numbered_channels(7), 250, data_uV,
            {{0.5, 0.1, "first"}, {0.75, kNone, "second"}, {4.0001, 0.9, "third"}});
  expect_as_edflib(scratch.folder / "a.edf");
}

TEST(BaseEdf, AgreesWithEdflibOnUnequalRangesAndRates) {
  const Scratch scratch;
  MadeEdf made;
  made.duration = "0.25";
  made.signals = {MadeSignal{}, MadeSignal{}, MadeSignal{}};
  made.signals[0] = {"A", "uV", "-187.5", "1234.25", "-2048", "2047", "8"};
  made.signals[1] = {"B", "mV", "3.3", "-3.2", "-32768", "32767", "2"};
  made.signals[2] = {"C", "degC", "30.01", "41.99", "0", "1000", "1"};
  RandomStream random(8, "edf ranges");
  made.data.clear();
  for (int r = 0; r < 50; ++r) {
    std::vector<int> values;
    for (int i = 0; i < 11; ++i)
      values.push_back(static_cast<int>(i < 10 ? 600 * random.normal() : 500));
    made.data.push_back(edf_samples(values));
  }
  expect_as_edflib(made.write(scratch.folder / "a.edf"));
}

TEST(BaseEdf, AgreesWithEdflibOnRecordingsOfPictures) {
  NEED_OPEN_DATA(folder, "pictures");
  expect_as_edflib(folder / "sub-c337/eeg/sub-c337_task-pictures_eeg.edf");
}

TEST(BaseEdf, AgreesWithEdflibOnFists) {
  NEED_OPEN_DATA(folder, "fists");
  // EDFlib wants the prefilter text of the annotation signal, the last of 65, blank.
  std::string bytes = read_file(folder / "S001R03.edf", "recording");
  const std::size_t at = 256 + 65 * (16 + 80 + 5 * 8) + 64 * 80;
  ASSERT_EQ(bytes.substr(at, 8), "HP:0Hz L");
  bytes.replace(at, 80, 80, ' ');
  const Scratch scratch;
  write_file(scratch.folder / "a.edf", bytes);
  expect_as_edflib(scratch.folder / "a.edf");
  const EdfFile original(folder / "S001R03.edf"), blanked(scratch.folder / "a.edf");
  EXPECT_EQ(all_samples(original, 63), all_samples(blanked, 63));
  EXPECT_EQ(original.annotations().size(), blanked.annotations().size());
}

// ---- a plain reader: the specification's table, field after field, one sample at a time

struct PlainSignal {
  std::string label;
  double physical_min, physical_max, digital_min, digital_max;
  int samples;
  std::vector<double> values;
};

std::vector<PlainSignal> read_plainly(const std::filesystem::path& path) {
  std::ifstream file(path, std::ios::binary);
  const auto field = [&](std::size_t width) {
    std::string text(width, ' ');
    file.read(text.data(), static_cast<std::streamsize>(width));
    return text.substr(0, text.find_last_not_of(' ') + 1);
  };
  field(236);
  const int records = std::stoi(field(8));
  field(8);
  std::vector<PlainSignal> signals(std::stoul(field(4)));
  for (auto& s : signals) s.label = field(16);
  for (std::size_t i = 0; i < signals.size(); ++i) field(88);
  for (auto& s : signals) s.physical_min = std::stod(field(8));
  for (auto& s : signals) s.physical_max = std::stod(field(8));
  for (auto& s : signals) s.digital_min = std::stod(field(8));
  for (auto& s : signals) s.digital_max = std::stod(field(8));
  for (std::size_t i = 0; i < signals.size(); ++i) field(80);
  for (auto& s : signals) s.samples = std::stoi(field(8));
  for (std::size_t i = 0; i < signals.size(); ++i) field(32);
  for (int r = 0; r < records; ++r)
    for (auto& s : signals)
      for (int k = 0; k < s.samples; ++k) {
        const int low = file.get(), high = file.get();
        int digital = low + 256 * high;
        if (digital >= 32768) digital -= 65536;
        s.values.push_back((digital - s.digital_min) * (s.physical_max - s.physical_min) /
                               (s.digital_max - s.digital_min) +
                           s.physical_min);
      }
  EXPECT_TRUE(file.good()) << path;
  EXPECT_EQ(file.peek(), std::ifstream::traits_type::eof()) << path;
  return signals;
}

void expect_as_read_plainly(const std::filesystem::path& path) {
  const EdfFile edf(path);
  std::size_t s = 0;
  for (const auto& plain : read_plainly(path)) {
    if (plain.label == "EDF Annotations") continue;
    ASSERT_LT(s, edf.signals().size());
    EXPECT_EQ(edf.signals()[s].label, plain.label);
    const auto values = all_samples(edf, s++);
    ASSERT_EQ(values.size(), plain.values.size());
    const double range = std::max(std::abs(plain.physical_min), std::abs(plain.physical_max));
    double worst = 0;
    for (std::size_t i = 0; i < values.size(); ++i)
      worst = std::max(worst, std::abs(values[i] - plain.values[i]));
    EXPECT_LE(worst, 4 * kEps * range) << plain.label;
  }
  EXPECT_EQ(s, edf.signals().size());
}

TEST(BaseEdf, AgreesWithAPlainReaderOnPictures) {
  NEED_OPEN_DATA(folder, "pictures");
  for (const char* person : {"c337", "c342", "c372"})
    expect_as_read_plainly(folder /
                           fmt::format("sub-{0}/eeg/sub-{0}_task-pictures_eeg.edf", person));
}

TEST(BaseEdf, AgreesWithAPlainReaderOnFists) {
  NEED_OPEN_DATA(folder, "fists");
  for (const char* run : {"S001R03.edf", "S001R04.edf"}) expect_as_read_plainly(folder / run);
}

TEST(BaseEdf, FistsHaveTheAnnotationsOfTheirTable) {
  NEED_OPEN_DATA(folder, "fists");
  const EdfFile edf(folder / "S001R03.edf");
  const Table table = read_table(folder / "S001R03_events.tsv", "events");
  ASSERT_EQ(edf.annotations().size(), table.rows.size());
  for (std::size_t i = 0; i < table.rows.size(); ++i) {
    EXPECT_EQ(edf.annotations()[i].onset_s, table.number(i, 0));
    EXPECT_EQ(edf.annotations()[i].duration_s, table.number(i, 1));
    EXPECT_EQ(edf.annotations()[i].text, table.rows[i][2]);
  }
}

// ---- examples of the EDF+ specification

const std::string kZero(1, '\0');

/// One record of a file whose annotation signal holds just this.
std::vector<EdfAnnotation> annotations_of(const std::string& lists, const std::string& stamp) {
  const Scratch scratch;
  return EdfFile(made_edf_plus("EDF+C", {stamp}, {lists}).write(scratch.folder / "a.edf"))
      .annotations();
}

// Section 2.2.2: "Lights off" and "Close door" 3 minutes after the start, in one list or in two; an
// apnea of 25.5 s at 1800.2 s.
TEST(BaseEdf, ReadsTheSpecificationsLists) {
  const std::string apnea =
      "+1800.2\x15"
      "25.5\x14"
      "Apnea\x14" +
      kZero;
  const std::string together =
      "+180\x14Lights off\x14"
      "Close door\x14" +
      kZero;
  const std::string apart = "+180\x14Lights off\x14" + kZero +
                            "+180\x14"
                            "Close door\x14" +
                            kZero;
  for (const auto& lists : {together + apnea, apart + apnea}) {
    const auto found = annotations_of(lists, "+0");
    ASSERT_EQ(found.size(), 3u);
    EXPECT_EQ(found[0].onset_s, 180);
    EXPECT_TRUE(std::isnan(found[0].duration_s));
    EXPECT_EQ(found[0].text, "Lights off");
    EXPECT_EQ(found[1].onset_s, 180);
    EXPECT_EQ(found[1].text, "Close door");
    EXPECT_EQ(found[2].onset_s, 1800.2);
    EXPECT_EQ(found[2].duration_s, 25.5);
    EXPECT_EQ(found[2].text, "Apnea");
  }
}

// Section 2.2.4: "+567" as the time-stamp of a record, and records that need not follow each other
// in an EDF+D file.
TEST(BaseEdf, ReadsTheSpecificationsTimeStamps) {
  const Scratch scratch;
  const EdfFile edf(made_edf_plus("EDF+D", {"+567", "+569.5"},
                                  {"+568\x14"
                                   "a\x14" +
                                       kZero,
                                   "-0.065\x14"
                                   "b\x14" +
                                       kZero})
                        .write(scratch.folder / "a.edf"));
  EXPECT_EQ(edf.record_onset_s(), (std::vector<double>{0, 2.5}));
  ASSERT_EQ(edf.annotations().size(), 2u);
  EXPECT_EQ(edf.annotations()[0].text, "b");
  EXPECT_EQ(edf.annotations()[0].onset_s, -0.065 - 567);
  EXPECT_EQ(edf.annotations()[1].onset_s, 1);
}

// Section 2.2.3: an event may share the time-keeping list, behind its empty text; section 2.2.1:
// there may be several annotation signals, of which the first times the records.
TEST(BaseEdf, ReadsSharedListsAndSeveralAnnotationSignals) {
  const Scratch scratch;
  MadeEdf made = made_edf_plus("EDF+C", {"+0"});
  made.signals.push_back(annotation_signal(40));
  made.data[0] = edf_samples({0, 1, 2, 3}) +
                 annotation_block(
                     "+0\x14\x14"
                     "click\x14" +
                         kZero,
                     80) +
                 annotation_block(
                     "+0.25\x14"
                     "reply\x14" +
                         kZero,
                     40);
  const EdfFile edf(made.write(scratch.folder / "a.edf"));
  EXPECT_EQ(edf.signals().size(), 1u);
  ASSERT_EQ(edf.annotations().size(), 2u);
  EXPECT_EQ(edf.annotations()[0].text, "click");
  EXPECT_EQ(edf.annotations()[1].text, "reply");
}

}  // namespace
}  // namespace headwater
