// SPDX-License-Identifier: GPL-3.0-or-later
#include "base/zlib_streams.hpp"
#include "base_scratch.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/json.hpp>
#include <headwater/base/progress.hpp>
#include <headwater/base/toml.hpp>

#include <fcntl.h>
#include <gtest/gtest.h>
#include <poll.h>
#include <unistd.h>

#include <cmath>
#include <cstdlib>
#include <thread>
#include <vector>

namespace headwater {
namespace {

std::size_t files_in(const std::filesystem::path& folder) {
  const std::filesystem::directory_iterator all(folder);
  return static_cast<std::size_t>(std::distance(begin(all), end(all)));
}

TEST(BaseFiles, WritesWholeAndLeavesNothingElse) {
  const Scratch scratch;
  const auto path = scratch.folder / "a" / "b.txt";
  const std::string bytes("x\0y\n", 4);
  write_file(path, "older and longer");
  write_file(path, bytes);
  EXPECT_EQ(read_file(path, "test file"), bytes);
  EXPECT_EQ(files_in(path.parent_path()), 1u);
  write_file(path, "");
  EXPECT_EQ(read_file(path, "test file"), "");
}

TEST(BaseFiles, TakesTheLongestNameAFileMayHave) {
  const Scratch scratch;
  const auto path = scratch.folder / std::string(255, 'n');
  write_file(path, "1");
  EXPECT_EQ(read_file(path, "test file"), "1");
}

TEST(BaseFiles, ReadersNeverSeeAPartWhileWritersRace) {
  const Scratch scratch;
  const auto path = scratch.folder / "shared";
  write_file(path, std::string(100000, 'a'));
  std::vector<std::jthread> writers;
  for (const char letter : {'b', 'c'})
    writers.emplace_back([&, letter] {
      for (int i = 0; i < 20; ++i) write_file(path, std::string(100000, letter));
    });
  for (int i = 0; i < 40; ++i) {
    const std::string seen = read_file(path, "test file");
    ASSERT_EQ(seen.size(), 100000u);
    ASSERT_EQ(seen, std::string(100000, seen[0]));
  }
}

TEST(BaseFiles, ZlibStreamsComeBackAndStopWhereAsked) {
  std::string bytes;
  for (int i = 0; i < 300000; ++i) bytes += static_cast<char>(i * i % 251);
  const std::string packed = gzip(bytes);
  EXPECT_TRUE(is_gzip(packed));
  EXPECT_EQ(packed, gzip(bytes));
  EXPECT_EQ(gunzip(packed, bytes.size()), bytes);
  EXPECT_EQ(gunzip(packed, 2 * bytes.size()), bytes);
  EXPECT_EQ(gunzip(packed, 10), bytes.substr(0, 10));
  EXPECT_EQ(gunzip(packed + gzip("tail"), 2 * bytes.size()), bytes + "tail");
  EXPECT_EQ(gunzip(gzip(""), 10), "");
}

TEST(BaseJson, KeepsOrderAndRoundTrips) {
  Json json;
  json.set("z", 1).set("a", 0.1).set("text", "tab\t\"quoted\" \xc3\xa9");
  json.set("list", std::vector<double>{1, 2.5, 1e300});
  json.set("flags", std::vector<bool>{true, false});
  json.set("nothing", nullptr).set("nan", std::nan("")).set("z", 2);
  Json nested;
  nested.push(Json::object()).push(Json::array()).push(Json::object().set("k", -3));
  json.set("nested", nested);
  const std::string text = json.dump();
  EXPECT_EQ(
      text,
      "{\n  \"z\": 2,\n  \"a\": 0.1,\n  \"text\": \"tab\\t\\\"quoted\\\" \xc3\xa9\",\n"
      "  \"list\": [1, 2.5, 1e+300],\n  \"flags\": [true, false],\n  \"nothing\": null,\n"
      "  \"nan\": null,\n  \"nested\": [\n    {},\n    [],\n    {\n      \"k\": -3\n    }\n  ]\n}");
  EXPECT_EQ(parse_json(text, "round trip").dump(), text);
}

TEST(BaseJson, LongListsTakeALineForEachItem) {
  const Json json(std::vector<int>(60, 10));
  const std::string text = json.dump();
  EXPECT_EQ(text.substr(0, 12), "[\n  10,\n  10");
  EXPECT_EQ(parse_json(text, "long list").items().size(), 60u);
}

TEST(BaseJson, NumbersComeBackToTheSameDouble) {
  for (const double value : {0.1, 1.0 / 3, 5e-324, 1.7976931348623157e308, -2.5e-8, 123456789.0})
    EXPECT_EQ(parse_json(Json(value).dump(), "number").number(), value);
  EXPECT_EQ(parse_json("18446744073709551615", "number").number(), 18446744073709551615.0);
}

TEST(BaseJson, WrongTypesAreProgrammersErrors) {
  EXPECT_THROW(Json("x").number(), std::logic_error);
  EXPECT_THROW(Json(1).text(), std::logic_error);
  EXPECT_THROW(Json(1).items(), std::logic_error);
  EXPECT_THROW(Json(1).members(), std::logic_error);
  EXPECT_THROW(Json(1).set("k", 2), std::logic_error);
  EXPECT_EQ(Json(1).find("k"), nullptr);
}

TEST(BaseToml, KeepsDocumentOrderAndPlaces) {
  const auto toml = parse_toml(
      "zeta = 1\nalpha = 2.5\n[windows]\nname = \"mismatch\"\n  [windows.more]\n  b.c = [1, 2,\n   "
      "3]\n"
      "[[conditions]]\nname = \"late\"\n[[conditions]]\nname = \"steady\"\nwhen = 2020-01-02\nok = "
      "true\n",
      "e.toml");
  const auto& members = std::get<TomlValue::Table>(toml.value);
  ASSERT_EQ(members.size(), 4u);
  EXPECT_EQ(members[0].first, "zeta");
  EXPECT_EQ(members[1].first, "alpha");
  EXPECT_EQ(members[2].first, "windows");
  EXPECT_EQ(members[3].first, "conditions");
  EXPECT_EQ(toml.find("zeta")->number(), 1);
  EXPECT_EQ(toml.find("alpha")->number(), 2.5);
  EXPECT_EQ(toml.find("alpha")->line, 2);
  EXPECT_EQ(toml.find("alpha")->column, 9);
  const auto* list = toml.find("windows")->find("more")->find("b")->find("c");
  ASSERT_NE(list, nullptr);
  EXPECT_EQ(list->line, 6);
  EXPECT_EQ(toml.find("windows")->find("more")->find("b")->line, 6);
  const auto& items = std::get<TomlValue::Array>(list->value);
  ASSERT_EQ(items.size(), 3u);
  EXPECT_EQ(items[2].line, 7);
  EXPECT_EQ(items[2].column, 4);
  const auto& conditions = std::get<TomlValue::Array>(toml.find("conditions")->value);
  ASSERT_EQ(conditions.size(), 2u);
  EXPECT_EQ(conditions[1].line, 10);
  EXPECT_EQ(std::get<std::string>(conditions[1].find("when")->value), "2020-01-02");
}

TEST(BaseToml, NamesKindsForMessages) {
  const auto toml = parse_toml("a=1\nb=1.5\nc='x'\nd=[]\ne={}\nf=true\ng=07:32:00\n", "e.toml");
  const std::vector<std::pair<const char*, const char*>> kinds{
      {"a", "a number"}, {"b", "a number"}, {"c", "text"},         {"d", "a list"},
      {"e", "a table"},  {"g", "text"},     {"f", "true or false"}};
  for (const auto& [key, kind] : kinds) EXPECT_EQ(toml.find(key)->kind(), kind) << key;
  EXPECT_THROW(toml.find("c")->number(), std::logic_error);
  EXPECT_EQ(toml.find("nothing"), nullptr);
}

TEST(BaseProgress, PlainLinesOffTerminalFromManyThreads) {
  std::FILE* out = std::tmpfile();
  ASSERT_NE(out, nullptr);
  {
    Progress progress(out, 40, "locate");
    std::vector<std::jthread> threads;
    for (int t = 0; t < 4; ++t)
      threads.emplace_back([&] {
        for (int i = 0; i < 10; ++i) progress.advance("sub-01");
      });
  }
  std::rewind(out);
  char line[80];
  int lines = 0;
  while (std::fgets(line, sizeof line, out))
    EXPECT_EQ(line, "locate: sub-01 (" + std::to_string(++lines) + " of 40)\n");
  EXPECT_EQ(lines, 40);
  std::fclose(out);
  Progress(nullptr, 3, "silent").advance("x");
}

#if defined(__linux__)
TEST(BaseProgress, BarOnATerminal) {
  const int master = ::posix_openpt(O_RDWR | O_NOCTTY);
  if (master < 0 || ::grantpt(master) != 0 || ::unlockpt(master) != 0)
    GTEST_SKIP() << "no pseudo-terminal";
  std::FILE* out = std::fopen(::ptsname(master), "w");
  if (!out) GTEST_SKIP() << "the pseudo-terminal does not open";
  {
    Progress progress(out, 2, "locate");
    progress.advance("sub-01");
    progress.advance("sub-02");
  }
  // A terminal hands over what it has by then: read until the line ends, or nothing comes.
  std::string text;
  pollfd waiting{master, POLLIN, 0};
  while (!text.ends_with('\n') && ::poll(&waiting, 1, 2000) > 0) {
    char buffer[2000];
    const ssize_t got = ::read(master, buffer, sizeof buffer);
    if (got <= 0) break;
    text.append(buffer, static_cast<std::size_t>(got));
  }
  std::fclose(out);
  ::close(master);
  ASSERT_FALSE(text.empty());
  EXPECT_NE(text.find("\r[============            ] 1/2 locate: sub-01"), std::string::npos)
      << text;
  EXPECT_NE(text.find("\r[========================] 2/2 locate: sub-02"), std::string::npos)
      << text;
  EXPECT_EQ(text.back(), '\n');
}
#endif

}  // namespace
}  // namespace headwater
