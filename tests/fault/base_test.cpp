// SPDX-License-Identifier: GPL-3.0-or-later
#include "base/zlib_streams.hpp"
#include "base_scratch.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/json.hpp>
#include <headwater/base/nifti.hpp>
#include <headwater/base/table.hpp>
#include <headwater/base/toml.hpp>
#include <headwater/base/vtk_grid.hpp>

#include <fmt/core.h>
#include <gtest/gtest.h>
#include <nifti1.h>
#include <sys/resource.h>
#include <unistd.h>

#include <cmath>
#include <csignal>
#include <cstring>
#include <limits>

namespace headwater {
namespace {

/// Expects every part in the text.
void expect_parts(const std::string& text, const std::vector<std::string>& parts) {
  for (const auto& part : parts)
    EXPECT_NE(text.find(part), std::string::npos) << part << "\nnot in: " << text;
}

std::string table_fault(const std::string& text) {
  return message_of<InputError>([&] { parse_table(text, "t.tsv"); });
}
std::string number_fault(const std::string& text) {
  return message_of<InputError>([&] { parse_number_table(text, "t.tsv"); });
}

TEST(BaseTableFault, HeadersThatCannotBe) {
  for (const auto& fault : {table_fault, number_fault}) {
    expect_parts(fault(""), {"t.tsv", "line 1", "empty"});
    expect_parts(fault("\n1\n"), {"t.tsv", "line 1", "empty"});
    expect_parts(fault("a\tb\n"), {"t.tsv", "no rows"});
    expect_parts(fault("a\t\tc\n1\t2\t3\n"), {"t.tsv", "line 1", "column 2 of 3"});
    expect_parts(fault("a\tb\ta\tb\tc\n1\t2\t3\t4\t5\n"), {"line 1", "repeated", "a and b"});
    expect_parts(fault("a,b\n1,2\n"), {"t.tsv", "commas", "tabs"});
    expect_parts(fault("a;b\n1;2\n"), {"t.tsv", "semicolons", "tabs"});
    expect_parts(fault("a\tb\r1\t2\r"), {"t.tsv", "carriage return"});
    expect_parts(fault(std::string("\xff\xfe"
                                   "a\0\t\0b\0\n\0",
                                   10)),
                 {"t.tsv", "NUL", "UTF-8"});
  }
}

TEST(BaseTableFault, RaggedRowsSayLineFoundAndExpected) {
  for (const auto& fault : {table_fault, number_fault}) {
    expect_parts(fault("a\tb\tc\n1\t2\t3\n1\t2\n"), {"line 3", "2 cells found", "3 expected"});
    expect_parts(fault("a\tb\tc\n1\t2\t3\t4\n"), {"line 2", "4 cells found", "3 expected"});
    expect_parts(fault("a\tb\n1\t2\n\n1\t2\n"), {"line 3", "empty"});
    expect_parts(fault("a\tb\n1\t2\t\n"), {"line 2", "3 cells found", "2 expected"});
  }
  expect_parts(number_fault("a\tb\tc\nx\t2\n"), {"line 2", "2 cells found"});
}

// 10^5 columns and 10^5 lines of one cell: the matrix they announce would take 80 GB.
TEST(BaseTableFault, RaggedRowsAllocateNoMoreThanTheText) {
  std::string text = "c0", lines;
  for (int i = 1; i < 100000; ++i) text += fmt::format("\tc{}", i);
  for (int i = 0; i < 100000; ++i) lines += "\n1";
  expect_parts(number_fault(text + lines), {"line 2", "1 cells found", "100000 expected"});
}

TEST(BaseTableFault, CellsThatAreNoFiniteNumber) {
  for (const std::string cell :
       {"nan", "inf", "-Infinity", "1e999", "n/a", "", "0x10", "1.5uV", "--1", "+-1"})
    expect_parts(number_fault("time_s\tCz\n0\t1\n0.1\t" + cell + "\n"),
                 {"t.tsv", "line 3", "'Cz'", "'" + cell + "'", "finite number"});
  expect_parts(number_fault("time_s\tCz\n0,5\t1\n"), {"line 2", "'time_s'", "'0,5'", "point"});
  expect_parts(number_fault("a\n" + std::string(5000, 'x') + "\n"), {"xxx...'"});
  const Table table = parse_table("name\tx_mm\nFz\tleft\nCz\tNaN\n", "t.tsv");
  expect_parts(message_of<InputError>([&] { table.number(0, 1); }), {"line 2", "'x_mm'", "'left'"});
  expect_parts(message_of<InputError>([&] { table.optional_number(1, 1); }), {"line 3", "'NaN'"});
  expect_parts(message_of<InputError>([&] { table.column("x_m"); }),
               {"'x_m'", "name and x_mm", "mean 'x_mm'"});
}

TEST(BaseTableFault, FilesThatAreNotThere) {
  const Scratch scratch;
  expect_parts(
      message_of<InputError>([&] { read_table(scratch.folder / "no.tsv", "participants table"); }),
      {"no.tsv", "participants table", "No such file"});
  expect_parts(message_of<InputError>([&] { read_number_table(scratch.folder, "average"); }),
               {scratch.folder.string(), "average", "directory"});
}

TEST(BaseFilesFault, AFolderThatIsAFile) {
  const Scratch scratch;
  write_file(scratch.folder / "plain", "1");
  expect_parts(
      message_of<ResourceError>([&] { write_file(scratch.folder / "plain" / "x" / "y.txt", "2"); }),
      {"y.txt", "Not a directory"});
}

TEST(BaseFilesFault, AFolderInTheWayLeavesNoPart) {
  const Scratch scratch;
  std::filesystem::create_directories(scratch.folder / "name" / "inside");
  EXPECT_THROW(write_file(scratch.folder / "name", "2"), ResourceError);
  const std::filesystem::directory_iterator all(scratch.folder);
  EXPECT_EQ(std::distance(begin(all), end(all)), 1);
}

TEST(BaseFilesFault, AFolderWithoutPermission) {
  if (::geteuid() == 0) GTEST_SKIP() << "root may write everywhere";
  const Scratch scratch;
  std::filesystem::permissions(scratch.folder, std::filesystem::perms::owner_read);
  EXPECT_THROW(write_file(scratch.folder / "x", "1"), ResourceError);
  std::filesystem::permissions(scratch.folder, std::filesystem::perms::owner_all);
}

// A limit on file size stands in for a full disk: write() fails half way.
TEST(BaseFilesFault, ADiskThatFillsUpKeepsTheOlderFile) {
  const Scratch scratch;
  const auto path = scratch.folder / "table.tsv";
  write_file(path, "older");
  rlimit before{};
  ASSERT_EQ(::getrlimit(RLIMIT_FSIZE, &before), 0);
  const auto handler = std::signal(SIGXFSZ, SIG_IGN);
  rlimit small = before;
  small.rlim_cur = 1000;
  ASSERT_EQ(::setrlimit(RLIMIT_FSIZE, &small), 0);
  std::string message;
  try {
    write_file(path, std::string(100000, 'n'));
  } catch (const ResourceError& error) {
    message = error.what();
  }
  ::setrlimit(RLIMIT_FSIZE, &before);
  std::signal(SIGXFSZ, handler);
  expect_parts(message, {"table.tsv", "File too large"});
  EXPECT_EQ(read_file(path, "table"), "older");
  const std::filesystem::directory_iterator all(scratch.folder);
  EXPECT_EQ(std::distance(begin(all), end(all)), 1);
}

TEST(BaseTomlFault, SyntaxErrorsSayLineAndColumn) {
  const auto fault = [](const std::string& text) {
    return message_of<ExperimentError>([&] { parse_toml(text, "e.toml"); });
  };
  expect_parts(fault("a = 1\nb = = 2\n"), {"e.toml:2:5: "});
  expect_parts(fault("a = 1\na = 2\n"), {"e.toml:2:"});
  expect_parts(fault("[t\n"), {"e.toml:1:"});
  expect_parts(fault("a = \"open\n"), {"e.toml:1:"});
  expect_parts(fault(std::string("a = 1\n\0", 7)), {"e.toml:2:"});
  expect_parts(fault("a = \"\xff\"\n"), {"e.toml:1:"});
  expect_parts(fault("a = " + std::string(100000, '[')), {"e.toml:1:"});
  expect_parts(message_of<ExperimentError>([] { read_toml("nowhere/e.toml"); }),
               {"nowhere/e.toml", "No such file"});
}

TEST(BaseJsonFault, SyntaxErrorsSayLineAndColumn) {
  const auto fault = [](const std::string& text) {
    return message_of<InputError>([&] { parse_json(text, "s.json"); });
  };
  expect_parts(fault("{\n  \"a\": 1,\n  \"b\": }\n"),
               {"s.json, line 3, column 8", "not valid JSON"});
  expect_parts(fault(""), {"s.json, line 1"});
  expect_parts(fault("{\"a\": 1e999}"), {"s.json"});
  expect_parts(fault(std::string(1000000, '[')), {"s.json", "levels deep"});
}

// ---- volumes

Volume small_volume() {
  Volume volume;
  volume.size = {3, 4, 5};
  volume.values = Eigen::MatrixXd::Random(60, 2);
  volume.time_step_s = 0.004;
  return volume;
}

/// Bytes of a valid file, unpacked, to be spoilt.
std::string nifti_bytes(const Scratch& scratch) {
  write_nifti(scratch.folder / "good.nii.gz", small_volume());
  return gunzip(read_file(scratch.folder / "good.nii.gz", "volume"), 1 << 20);
}

std::string nifti_fault(const Scratch& scratch, const std::string& bytes) {
  write_file(scratch.folder / "bad.nii", bytes);
  const std::string plain = message_of<InputError>([&] { read_nifti(scratch.folder / "bad.nii"); });
  write_file(scratch.folder / "bad.nii.gz", gzip(bytes));
  const std::string packed =
      message_of<InputError>([&] { read_nifti(scratch.folder / "bad.nii.gz"); });
  EXPECT_EQ(plain.substr(plain.find(": ")), packed.substr(packed.find(": ")));
  return plain;
}

template <typename Change>
std::string with_header(std::string bytes, Change&& change) {
  nifti_1_header header;
  std::memcpy(&header, bytes.data(), sizeof header);
  change(header);
  std::memcpy(bytes.data(), &header, sizeof header);
  return bytes;
}

TEST(BaseNiftiFault, FilesThatEndEarly) {
  const Scratch scratch;
  const std::string good = nifti_bytes(scratch);
  ASSERT_EQ(good.size(), 352u + 60 * 2 * 4);
  expect_parts(nifti_fault(scratch, good.substr(0, 500)), {"bad.nii", "500 bytes", "promises 832"});
  expect_parts(nifti_fault(scratch, good.substr(0, 100)), {"100 bytes", "348"});
  expect_parts(nifti_fault(scratch, ""), {"not NIfTI"});
  const std::string packed = read_file(scratch.folder / "good.nii.gz", "volume");
  write_file(scratch.folder / "cut.nii.gz", packed.substr(0, packed.size() / 2));
  expect_parts(message_of<InputError>([&] { read_nifti(scratch.folder / "cut.nii.gz"); }),
               {"cut.nii.gz", "promises"});
  std::string damaged = packed;
  for (std::size_t i = 200; i < 260; ++i) damaged[i] = static_cast<char>(~damaged[i]);
  write_file(scratch.folder / "damaged.nii.gz", damaged);
  EXPECT_THROW(read_nifti(scratch.folder / "damaged.nii.gz"), InputError);
}

// The header promises 32767^4 doubles (9e18 bytes): to believe it is to die.
TEST(BaseNiftiFault, HeadersThatPromiseTooMuchAllocateNothing) {
  const Scratch scratch;
  const std::string bytes = with_header(nifti_bytes(scratch), [](nifti_1_header& header) {
    for (int i = 1; i <= 4; ++i) header.dim[i] = 32767;
    header.datatype = DT_FLOAT64;
    header.bitpix = 64;
  });
  rusage before{}, after{};
  ::getrusage(RUSAGE_SELF, &before);
  expect_parts(nifti_fault(scratch, bytes), {"promises 9222246188486492520", "cut short"});
  ::getrusage(RUSAGE_SELF, &after);
  EXPECT_LT(after.ru_maxrss - before.ru_maxrss, 50000);  // kB
}

TEST(BaseNiftiFault, HeadersThatMakeNoSense) {
  const Scratch scratch;
  const std::string good = nifti_bytes(scratch);
  const auto fault = [&](auto&& change) { return nifti_fault(scratch, with_header(good, change)); };
  using Header = nifti_1_header;
  expect_parts(fault([](Header& h) { std::memcpy(h.magic, "abc", 4); }), {"not NIfTI-1"});
  expect_parts(fault([](Header& h) { std::memcpy(h.magic, "ni1", 4); }), {"pair", "Convert"});
  expect_parts(fault([](Header& h) { h.sizeof_hdr = 540; }), {"NIfTI-2"});
  expect_parts(fault([](Header& h) { h.dim[0] = 2; }), {"2 dimensions"});
  expect_parts(fault([](Header& h) { h.dim[0] = 99; }), {"dimensions"});
  expect_parts(fault([](Header& h) { h.dim[2] = -4; }), {"size -4 along dimension 2"});
  expect_parts(fault([](Header& h) { h.dim[0] = 5, h.dim[5] = 3; }), {"size 3 along dimension 5"});
  expect_parts(fault([](Header& h) { h.datatype = DT_RGB24; }), {"RGB24", "plain numbers"});
  expect_parts(fault([](Header& h) { h.datatype = DT_COMPLEX256; }), {"COMPLEX256"});
  expect_parts(fault([](Header& h) { h.datatype = 12345; }), {"plain numbers"});
  expect_parts(fault([](Header& h) { h.vox_offset = std::nanf(""); }), {"puts the data"});
  expect_parts(fault([](Header& h) { h.vox_offset = -1e30f; }), {"puts the data"});
  expect_parts(fault([](Header& h) { h.sform_code = h.qform_code = 0; }), {"sform and qform"});
  expect_parts(fault([](Header& h) { std::fill_n(h.srow_y, 4, 0.0f); }), {"singular"});
  expect_parts(fault([](Header& h) { h.srow_x[3] = std::numeric_limits<float>::infinity(); }),
               {"affine"});
}

TEST(BaseNiftiFault, WritersRefuseWhatAFormatCannotHold) {
  const Scratch scratch;
  Volume volume = small_volume();
  volume.size[0] = 2;
  EXPECT_THROW(write_nifti(scratch.folder / "x.nii.gz", volume), std::logic_error);
  EXPECT_THROW(write_vti(scratch.folder / "x.vti", volume), std::logic_error);
  volume = small_volume();
  EXPECT_THROW(write_vti(scratch.folder / "x.vti", volume, 2), std::logic_error);
  volume.affine_mm(0, 0) = -2;
  EXPECT_THROW(write_vti(scratch.folder / "x.vti", volume), std::logic_error);
  write_file(scratch.folder / "plain", "1");
  EXPECT_THROW(write_nifti(scratch.folder / "plain" / "x.nii.gz", volume), ResourceError);
}

}  // namespace
}  // namespace headwater
