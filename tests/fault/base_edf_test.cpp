// SPDX-License-Identifier: GPL-3.0-or-later
// EDF files that are wrong: a clear message, no crash, no large allocation.
#include "base_scratch.hpp"
#include "edf_support.hpp"

#include <headwater/base/edf.hpp>
#include <headwater/base/edf_writing.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/random.hpp>

#include <gtest/gtest.h>
#include <sys/resource.h>

#include <algorithm>
#include <fstream>

namespace headwater {
namespace {

const std::string kZero(1, '\0');

/// The message names the file and holds each of `parts`.
void expect_refused(const std::filesystem::path& path, const std::vector<std::string>& parts) {
  const std::string message = message_of<InputError>([&] { EdfFile{path}; });
  EXPECT_EQ(message.rfind(path.string(), 0), 0u) << message;
  for (const auto& part : parts) EXPECT_NE(message.find(part), std::string::npos) << message;
}

void expect_refused(const MadeEdf& made, const std::vector<std::string>& parts) {
  const Scratch scratch;
  expect_refused(made.write(scratch.folder / "bad.edf"), parts);
}

/// One of the header's fields, set to something wrong.
template <typename Change>
MadeEdf changed(Change change) {
  MadeEdf made;
  change(made);
  return made;
}

/// A field of the one signal.
MadeEdf with(std::string MadeSignal::*field, const std::string& text) {
  return changed([&](MadeEdf& made) { made.signals[0].*field = text; });
}

TEST(BaseEdfFault, NoFileAtAll) {
  const Scratch scratch;
  expect_refused(scratch.folder / "none.edf", {"cannot be read", "No such file"});
  expect_refused(scratch.folder, {"cannot be read", "directory"});
  expect_refused("/dev/null", {"not a regular file"});
  write_file(scratch.folder / "empty.edf", "");
  expect_refused(scratch.folder / "empty.edf", {"holds 0 bytes", "at least 256"});
}

TEST(BaseEdfFault, TheHeaderIsCutShort) {
  const Scratch scratch;
  const std::string bytes = MadeEdf().bytes();
  for (std::size_t length = 0; length < bytes.size(); ++length) {
    std::ofstream(scratch.folder / "cut.edf", std::ios::binary) << bytes.substr(0, length);
    const std::string message =
        message_of<InputError>([&] { EdfFile{scratch.folder / "cut.edf"}; });
    EXPECT_NE(message.find(length < 256   ? "at least 256"
                           : length < 512 ? "its header alone should have 512"
                                          : "1 announced, but the file holds 0 whole records"),
              std::string::npos)
        << message;
  }
}

TEST(BaseEdfFault, ItIsAnotherFormat) {
  MadeEdf bdf;
  bdf.version =
      "\xff"
      "BIOSEMI";
  expect_refused(bdf, {"'version'", "BDF", "24 bits"});
  MadeEdf other;
  other.version = "BrainVis";
  expect_refused(other, {"'version'", "found 'BrainVis'", "EDF"});
}

TEST(BaseEdfFault, FieldsThatAreNoNumbers) {
  const std::string field = "'number of data records': found ";
  for (const char* text : {"many", "1.5", "1e9", "0x10", "", "- 1", "+-1", "1 2", "-2"})
    expect_refused(changed([&](MadeEdf& made) { made.records = text; }),
                   {field + "'" + text + "', expected a whole number"});
  for (const char* text : {"fast", "nan", "inf", "-1", "1,0", "1s", "1e400"})
    expect_refused(changed([&](MadeEdf& made) { made.duration = text; }),
                   {"'duration of a data record': found '" + std::string(text) + "'"});
  for (const char* text : {"", "0", "-1", "a", "1.0"})
    expect_refused(changed([&](MadeEdf& made) { made.signal_count = text; }),
                   {"'number of signals': found '" + std::string(text) + "'"});
  expect_refused(with(&MadeSignal::physical_min, "low"),
                 {"signal 1 of 1 ('Cz'), header field 'physical minimum': found 'low'"});
  expect_refused(with(&MadeSignal::physical_max, "1,5"), {"'physical maximum': found '1,5'"});
  expect_refused(with(&MadeSignal::digital_min, "-3e4"), {"'digital minimum': found '-3e4'"});
  expect_refused(with(&MadeSignal::digital_max, "8388607"),
                 {"'digital maximum': found '8388607'", "-32768 to 32767"});
  expect_refused(with(&MadeSignal::samples, "four"),
                 {"'number of samples in each data record': found 'four'"});
}

TEST(BaseEdfFault, CountsThatLie) {
  expect_refused(changed([](MadeEdf& made) { made.header_bytes = "768"; }),
                 {"'number of bytes in header': found '768', expected 512"});
  expect_refused(changed([](MadeEdf& made) { made.signal_count = "2"; }),
                 {"'number of bytes in header': found '512', expected 768"});
  expect_refused(changed([](MadeEdf& made) {
                   made.signal_count = "9999";
                   made.header_bytes = "2560000";
                 }),
                 {"holds 520 bytes", "2560000", "cut short"});
  expect_refused(changed([](MadeEdf& made) { made.records = "3"; }),
                 {"3 announced, but the file holds 1 whole records of 8 bytes", "cut short"});
  expect_refused(changed([](MadeEdf& made) {
                   made.data.push_back("abc");
                   made.records = "2";
                 }),
                 {"2 announced", "1 whole records of 8 bytes and 3 bytes of a further one"});
  expect_refused(changed([](MadeEdf& made) {
                   made.data = {made.data[0], made.data[0]};
                   made.records = "1";
                 }),
                 {"1 announced, but the file holds 2", "something follows"});
  expect_refused(with(&MadeSignal::samples, "99999999"), {"0 whole records of 199999998 bytes"});
}

TEST(BaseEdfFault, NothingInIt) {
  expect_refused(changed([](MadeEdf& made) {
                   made.records = "0";
                   made.data.clear();
                 }),
                 {"'number of data records': found '0'", "empty"});
  expect_refused(changed([](MadeEdf& made) {
                   made.records = "-1";
                   made.data.clear();
                 }),
                 {"not closed", "no whole record"});
  expect_refused(with(&MadeSignal::samples, "0"), {"found '0'", "1 or more"});
  expect_refused(changed([](MadeEdf& made) { made.duration = "0"; }),
                 {"'duration of a data record': found 0"});
  expect_refused(changed([](MadeEdf& made) { made.duration = "1e-320"; }),  // an infinite rate
                 {"'duration of a data record': found '1e-320'"});
  MadeEdf only_annotations = made_edf_plus("EDF+C", {"+0"});
  only_annotations.signals.erase(only_annotations.signals.begin());
  only_annotations.data = {annotation_block("+0\x14\x14" + kZero, 80)};
  expect_refused(only_annotations, {"'number of signals'", "no samples"});
}

TEST(BaseEdfFault, RangesWithoutScale) {
  expect_refused(with(&MadeSignal::physical_max, "-100.0"),
                 {"'physical maximum': found -100, the same as the physical minimum"});
  expect_refused(with(&MadeSignal::digital_max, "-32768"), {"'digital maximum': found -32768"});
  expect_refused(with(&MadeSignal::digital_min, "32767"), {"more than the digital minimum 32767"});
  expect_refused(changed([](MadeEdf& made) {
                   made.signals[0].physical_min = "-1e308";
                   made.signals[0].physical_max = "1e308";
                 }),
                 {"'physical maximum'", "too large"});
}

TEST(BaseEdfFault, TextThatIsNotAscii) {
  expect_refused(with(&MadeSignal::label, "F\xc3\xbc"),
                 {"'label': found 'F\\xc3\\xbc', expected printable ASCII"});
  expect_refused(with(&MadeSignal::label, "C\tz"), {"'label': found 'C\\x09z'"});
  expect_refused(with(&MadeSignal::unit,
                      "\xb0"
                      "C"),
                 {"'physical dimension': found '\\xb0C'"});
  expect_refused(with(&MadeSignal::samples, "\xd9\xa4"), {"found '\\xd9\\xa4'"});
}

TEST(BaseEdfFault, TenToTheNineRecordsInOneKilobyte) {
  // Eight characters hold 99999999 at most.
  MadeEdf made;
  made.records = "99999999";
  made.data = {std::string(512, 'x')};
  rusage before{}, after{};
  getrusage(RUSAGE_SELF, &before);
  expect_refused(made, {"99999999 announced, but the file holds 64 whole records"});
  getrusage(RUSAGE_SELF, &after);
  EXPECT_LT(after.ru_maxrss - before.ru_maxrss, 16 * 1024);  // kB
}

TEST(BaseEdfFault, EdfPlusWithoutItsTimes) {
  MadeEdf none;
  none.reserved = "EDF+C";
  expect_refused(none, {"'reserved'", "no signal 'EDF Annotations'"});
  MadeEdf unknown;
  unknown.reserved = "EDF+X";
  expect_refused(unknown, {"'reserved': found 'EDF+X'"});
  MadeEdf plain = made_edf_plus("", {"+0"});
  expect_refused(plain, {"signal 2 of 2 ('EDF Annotations')", "neither"});

  MadeEdf silent = made_edf_plus("EDF+D", {"+0", "+1", "+2"});
  silent.data[1] = edf_samples({1, 2, 3, 4}) + std::string(80, '\0');
  expect_refused(silent, {"record 2 of 3 has no time-stamp"});
  silent.data[1] = edf_samples({1, 2, 3, 4}) + annotation_block("+1\x14text\x14" + kZero, 80);
  expect_refused(silent, {"record 2 of 3 has no time-stamp"});

  expect_refused(made_edf_plus("EDF+D", {"+0", "+2", "+1"}), {"record 3 of 3", "go back"});
  expect_refused(made_edf_plus("EDF+D", {"+0", "+0.5"}), {"record 2 of 2", "go back"});
  expect_refused(made_edf_plus("EDF+C", {"+0", "+1", "+3"}),
                 {"record 3 of 3 begins 2 s after", "a gap", "EDF+C"});
}

TEST(BaseEdfFault, AnnotationsWithoutOnset) {
  const auto refused = [](const std::string& list, const std::vector<std::string>& parts) {
    expect_refused(made_edf_plus("EDF+C", {"+0", "+1"}, {"", list}), parts);
  };
  const std::string onset = "record 2 of 2: an annotation without onset";
  for (const std::string head : {"", "late", "12", "+", "+1.2.3", "+1e3", "+ 1", "+nan", "++1"})
    refused(head + "\x14text\x14" + kZero, {onset, "text"});
  refused(
      "\x15"
      "2\x14text\x14" +
          kZero,
      {onset});
  for (const std::string duration : {"long", "-1", "+1", "1e3", "."})
    refused("+1\x15" + duration + "\x14text\x14" + kZero,
            {"record 2 of 2: duration", "'" + duration + "'"});
  refused("+1\x14text" + kZero, {"record 2 of 2: the annotation", "cut short"});
  refused("+1" + kZero, {"cut short"});
  refused("+1\x14" + std::string(200, 'x'), {"cut short", "..."});
}

TEST(BaseEdfFault, FlippedBytesOfTheHeaderNeverCrash) {
  const Scratch scratch;
  const auto path = scratch.folder / "flipped.edf";
  RandomStream random(17, "flipped headers");
  const auto below = [&](std::size_t limit) {
    return std::min(limit - 1,
                    static_cast<std::size_t>(random.uniform() * static_cast<double>(limit)));
  };
  const std::string list =
      "+0.5\x15"
      "0.25\x14late\x14" +
      kZero;
  const std::string sound = made_edf_plus("EDF+D", {"+0", "+1", "+5"}, {list}).bytes();
  const std::string likely = "0123456789+-. eEx\x14\x15" + kZero;
  int opened = 0, refused = 0;
  for (int trial = 0; trial < 2000; ++trial) {
    std::string bytes = sound;
    for (std::size_t flips = 1 + below(4); flips > 0; --flips)
      bytes[below(bytes.size())] =
          trial % 2 ? likely[below(likely.size())] : static_cast<char>(below(256));
    if (trial % 5 == 0) bytes.resize(below(bytes.size()));
    std::ofstream(path, std::ios::binary) << bytes;
    try {
      const EdfFile edf(path);
      for (std::size_t s = 0; s < edf.signals().size(); ++s) {
        const auto count = edf.signals()[s].samples_per_record * edf.records();
        ASSERT_LE(2 * count, static_cast<std::int64_t>(bytes.size()));
        std::vector<double> values(static_cast<std::size_t>(count));
        edf.read(s, 0, count, 1, values.data());
      }
      ++opened;
    } catch (const Error&) {
      ++refused;
    }
  }
  EXPECT_GT(opened, 100);
  EXPECT_GT(refused, 100);
}

TEST(BaseEdfFault, WritingWhereNothingMayBeWritten) {
  const Scratch scratch;
  const Eigen::MatrixXd zeros = Eigen::MatrixXd::Zero(1, 10);
  write_file(scratch.folder / "file", "x");
  EXPECT_THROW(write_edf(scratch.folder / "file/a.edf", {"A"}, 10, zeros, {}), ResourceError);
  std::filesystem::create_directories(scratch.folder / "a.edf");
  EXPECT_THROW(write_edf(scratch.folder / "a.edf", {"A"}, 10, zeros, {}), ResourceError);
  EXPECT_EQ(std::distance(std::filesystem::directory_iterator(scratch.folder), {}), 2);
}

}  // namespace
}  // namespace headwater
