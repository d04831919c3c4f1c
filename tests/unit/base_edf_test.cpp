// SPDX-License-Identifier: GPL-3.0-or-later
#include "base_scratch.hpp"
#include "edf_support.hpp"

#include <headwater/base/edf.hpp>
#include <headwater/base/edf_writing.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/random.hpp>

#include <gtest/gtest.h>

#include <cmath>
#include <fstream>
#include <limits>
#include <stdexcept>

namespace headwater {
namespace {

constexpr double kNone = std::numeric_limits<double>::quiet_NaN();

std::vector<double> all_samples(const EdfFile& edf, std::size_t signal) {
  const auto count = edf.signals()[signal].samples_per_record * edf.records();
  std::vector<double> values(static_cast<std::size_t>(count));
  edf.read(signal, 0, count, 1, values.data());
  return values;
}

TEST(BaseEdf, WhatIsWrittenIsReadWithinHalfAStep) {
  const Scratch scratch;
  RandomStream random(5, "edf");
  const Eigen::MatrixXd data_uV = 30 * random.normal_matrix(3, 4 * 50);
  const std::vector<EdfAnnotation> annotations = {
      {0.25, 0.5, "late"}, {1.5, kNone, "steady, \xc3\xa4"}, {3.9999, 0, "end"}};
  write_edf(scratch.folder / "a.edf", {"Fz", "Cz", "nose"}, 50, data_uV, annotations);

  const EdfFile edf(scratch.folder / "a.edf");
  EXPECT_EQ(edf.kind(), EdfFile::Kind::continuous);
  EXPECT_EQ(edf.records(), 4);
  EXPECT_EQ(edf.record_duration_s(), 1);
  EXPECT_EQ(edf.record_onset_s(), (std::vector<double>{0, 1, 2, 3}));
  ASSERT_EQ(edf.signals().size(), 3u);
  EXPECT_EQ(edf.signals()[2].label, "nose");
  EXPECT_EQ(edf.signals()[2].unit, "uV");
  const double step = std::ceil(data_uV.cwiseAbs().maxCoeff()) / 32767;
  for (std::size_t c = 0; c < 3; ++c) {
    EXPECT_EQ(edf.signals()[c].scale, step);
    EXPECT_EQ(edf.signals()[c].offset, 0);
    const auto values = all_samples(edf, c);
    const Eigen::Map<const Eigen::RowVectorXd> read(values.data(), 200);
    EXPECT_LE((read - data_uV.row(static_cast<Eigen::Index>(c))).cwiseAbs().maxCoeff(),
              0.5 * step * (1 + 1e-9));
  }
  ASSERT_EQ(edf.annotations().size(), annotations.size());
  for (std::size_t i = 0; i < annotations.size(); ++i) {
    EXPECT_EQ(edf.annotations()[i].text, annotations[i].text);
    EXPECT_DOUBLE_EQ(edf.annotations()[i].onset_s, annotations[i].onset_s);
  }
  EXPECT_EQ(edf.annotations()[0].duration_s, 0.5);
  EXPECT_TRUE(std::isnan(edf.annotations()[1].duration_s));
}

TEST(BaseEdf, EqualDataGiveEqualBytesAndNoTraceOfThePersonOrTheDay) {
  const Scratch scratch;
  const Eigen::MatrixXd data_uV = Eigen::MatrixXd::Constant(2, 20, -7);
  for (const char* name : {"a.edf", "b.edf"})
    write_edf(scratch.folder / name, {"A", "B"}, 10, data_uV, {{0.5, kNone, "x"}});
  const std::string bytes = read_file(scratch.folder / "a.edf", "recording");
  EXPECT_EQ(bytes, read_file(scratch.folder / "b.edf", "recording"));
  EXPECT_EQ(bytes.substr(8, 80), edf_field("X X X X", 80));
  EXPECT_EQ(bytes.substr(88, 80), edf_field("Startdate 01-JAN-2000 X X invented", 80));
  EXPECT_EQ(bytes.substr(168, 16), "01.01.0000.00.00");
  // Nothing but the two files is left in the folder.
  EXPECT_EQ(std::distance(std::filesystem::directory_iterator(scratch.folder), {}), 2);
}

TEST(BaseEdf, ManyAnnotationsInOneSecondAreAllKept) {
  const Scratch scratch;
  std::vector<EdfAnnotation> annotations;
  for (int i = 0; i < 100; ++i) annotations.push_back({0.01 * i, kNone, "n" + std::to_string(i)});
  write_edf(scratch.folder / "a.edf", {"A"}, 100, Eigen::MatrixXd::Zero(1, 200), annotations);
  const EdfFile edf(scratch.folder / "a.edf");
  ASSERT_EQ(edf.annotations().size(), 100u);
  for (std::size_t i = 0; i < 100; ++i) EXPECT_EQ(edf.annotations()[i].text, annotations[i].text);
}

TEST(BaseEdf, WritingRefusesWhatTheFormatCannotHold) {
  const Scratch scratch;
  const auto path = scratch.folder / "a.edf";
  const Eigen::MatrixXd zeros = Eigen::MatrixXd::Zero(1, 20);
  EXPECT_THROW(write_edf(path, {"A"}, 15, zeros, {}), std::logic_error);
  EXPECT_THROW(write_edf(path, {"A", "B"}, 10, zeros, {}), std::logic_error);
  EXPECT_THROW(write_edf(path, {"a name of seventeen"}, 10, zeros, {}), std::logic_error);
  EXPECT_THROW(write_edf(path, {"A"}, 10, zeros, {{-1, kNone, "x"}}), std::logic_error);
  EXPECT_THROW(write_edf(path, {"A"}, 10, zeros.array() + 1e8, {}), std::logic_error);
  EXPECT_THROW(write_edf(path, {"A"}, 10, zeros, {{1, kNone, "a\tb"}}), std::logic_error);
  EXPECT_TRUE(std::filesystem::is_empty(scratch.folder));
}

TEST(BaseEdf, ScalesAsTheFormulaSaysByHand) {
  const Scratch scratch;
  MadeEdf made;
  made.signals[0] = {"EEG Cz", "mV", "-1", "+3.5E0", "-100", "200", "4"};
  made.data = {edf_samples({-100, 200, 0, 50})};
  const EdfFile edf(made.write(scratch.folder / "a.edf"));
  // (d + 100) 4.5 / 300 - 1
  const auto values = all_samples(edf, 0);
  EXPECT_DOUBLE_EQ(values[0], -1);
  EXPECT_DOUBLE_EQ(values[1], 3.5);
  EXPECT_DOUBLE_EQ(values[2], 0.5);
  EXPECT_DOUBLE_EQ(values[3], 1.25);
  EXPECT_EQ(edf.kind(), EdfFile::Kind::plain);
  EXPECT_TRUE(edf.annotations().empty());
}

TEST(BaseEdf, AGainMayBeNegativeAndSamplesReachBothEnds) {
  const Scratch scratch;
  MadeEdf made;
  made.signals[0] = {"A", "uV", "32768", "-32767", "-32768", "32767", "4"};
  made.data = {edf_samples({-32768, 32767, -1, 0})};
  EXPECT_EQ(all_samples(EdfFile(made.write(scratch.folder / "a.edf")), 0),
            (std::vector<double>{32768, -32767, 1, 0}));
}

TEST(BaseEdf, ReadsAnyPieceWithAnyStrideAndFactor) {
  const Scratch scratch;
  MadeEdf made;
  made.signals = {MadeSignal{}, MadeSignal{}};
  made.signals[0].samples = "3";
  made.signals[1] = {"B", "uV", "-32768", "32767", "-32768", "32767", "2"};
  made.data = {edf_samples({9, 9, 9, 0, 1}), edf_samples({9, 9, 9, 2, 3}),
               edf_samples({9, 9, 9, 4, 5})};
  const EdfFile edf(made.write(scratch.folder / "a.edf"));
  for (std::int64_t first = 0; first <= 6; ++first)
    for (std::int64_t count = 0; count <= 6 - first; ++count)
      for (const std::int64_t stride : {1, 3}) {
        std::vector<double> out(20, -1);
        edf.read(1, first, count, 10, out.data(), stride);
        for (std::int64_t i = 0; i < 6; ++i)
          EXPECT_EQ(out[static_cast<std::size_t>(i * stride)],
                    i < count ? 10.0 * static_cast<double>(first + i) : -1);
      }
  double out = 0;
  EXPECT_THROW(edf.read(1, 6, 1, 1, &out), std::logic_error);
  EXPECT_THROW(edf.read(1, -1, 1, 1, &out), std::logic_error);
  EXPECT_THROW(edf.read(2, 0, 1, 1, &out), std::logic_error);
  EXPECT_THROW(edf.read(1, std::numeric_limits<std::int64_t>::max(), 1, 1, &out), std::logic_error);
  EXPECT_THROW(edf.read(1, 0, std::numeric_limits<std::int64_t>::max(), 1, &out), std::logic_error);
}

TEST(BaseEdf, HonoursTheGapsOfEdfD) {
  const Scratch scratch;
  const EdfFile edf(
      made_edf_plus("EDF+D", {"+0", "+1", "+7.25", "+8.25"}).write(scratch.folder / "a.edf"));
  EXPECT_EQ(edf.kind(), EdfFile::Kind::discontinuous);
  EXPECT_EQ(edf.record_onset_s(), (std::vector<double>{0, 1, 7.25, 8.25}));
}

TEST(BaseEdf, TimesCountFromTheFirstRecord) {
  const Scratch scratch;
  // The header's start time has whole seconds: the first record began half a second later.
  const std::string mark = std::string("+1.75\x15") + "0.25\x14here\x14" + std::string(1, '\0');
  const EdfFile edf(
      made_edf_plus("EDF+C", {"+0.5", "+1.5"}, {"", mark}).write(scratch.folder / "a.edf"));
  EXPECT_EQ(edf.record_onset_s(), (std::vector<double>{0, 1}));
  ASSERT_EQ(edf.annotations().size(), 1u);
  EXPECT_EQ(edf.annotations()[0].onset_s, 1.25);
  EXPECT_EQ(edf.annotations()[0].duration_s, 0.25);
}

TEST(BaseEdf, StampsMayBeRoundedByLessThanHalfASample) {
  const Scratch scratch;
  EXPECT_NO_THROW(
      EdfFile(made_edf_plus("EDF+C", {"+0", "+1.1", "+1.99"}).write(scratch.folder / "a.edf")));
}

TEST(BaseEdf, ANotClosedRecordingHasTheWholeRecordsThatAreThere) {
  const Scratch scratch;
  MadeEdf made;
  made.records = "-1";
  made.data = {edf_samples({1, 2, 3, 4}), edf_samples({5, 6, 7, 8}), edf_samples({9})};
  EXPECT_EQ(EdfFile(made.write(scratch.folder / "a.edf")).records(), 2);
}

TEST(BaseEdf, UnitsMayHaveAMicroSign) {
  const Scratch scratch;
  for (const char* unit : {"\xb5V", "\xc2\xb5V", "\xce\xbcV"}) {
    MadeEdf made;
    made.signals[0].unit = unit;
    EXPECT_EQ(EdfFile(made.write(scratch.folder / "a.edf")).signals()[0].unit, "\xc2\xb5V");
  }
}

TEST(BaseEdf, TextThatIsNoUtf8IsLatin1) {
  const Scratch scratch;
  const std::string zero(1, '\0');
  const std::string latin =
                        "+0\x14"
                        "h\xf6ren\x14" +
                        zero,
                    utf8 =
                        "+0\x14"
                        "h\xc3\xb6ren\x14" +
                        zero;
  const EdfFile edf(
      made_edf_plus("EDF+C", {"+0", "+1"}, {latin, utf8}).write(scratch.folder / "a.edf"));
  ASSERT_EQ(edf.annotations().size(), 2u);
  EXPECT_EQ(edf.annotations()[0].text, "h\xc3\xb6ren");
  EXPECT_EQ(edf.annotations()[1].text, "h\xc3\xb6ren");
}

TEST(BaseEdf, CanBeMoved) {
  const Scratch scratch;
  EdfFile first(MadeEdf().write(scratch.folder / "a.edf"));
  EdfFile second = std::move(first);
  EXPECT_EQ(second.records(), 1);
}

}  // namespace
}  // namespace headwater
