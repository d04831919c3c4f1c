// SPDX-License-Identifier: GPL-3.0-or-later
#include "base_scratch.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/json.hpp>
#include <headwater/base/random.hpp>
#include <headwater/base/table.hpp>

#include <fmt/core.h>
#include <gtest/gtest.h>

#include <bit>
#include <cmath>
#include <filesystem>
#include <limits>

namespace headwater {
namespace {

TEST(BaseTable, ReadsTextCellsWithTheirLines) {
  const Table table =
      parse_table("\xef\xbb\xbfname\tage\r\nA b\t31\r\n\tn/a\r\n\r\n", "people.tsv");
  EXPECT_EQ(table.columns, (Labels{"name", "age"}));
  ASSERT_EQ(table.rows.size(), 2u);
  EXPECT_EQ(table.rows[0][0], "A b");
  EXPECT_EQ(table.rows[1][0], "");
  EXPECT_EQ(table.lines, (std::vector<int>{2, 3}));
  EXPECT_EQ(table.column("age"), 1u);
  EXPECT_FALSE(table.find_column("Age"));
  EXPECT_EQ(table.number(0, 1), 31);
  EXPECT_FALSE(table.optional_number(1, 1));
  EXPECT_FALSE(table.optional_number(1, 0));
}

TEST(BaseTable, ReadsNumbersInEveryDecimalForm) {
  const NumberTable table = parse_number_table("a\tb\tc\n-1.5e-3\t+2\t .25 \n7\t0\t1E3", "n");
  Eigen::MatrixXd expected(2, 3);
  expected << -1.5e-3, 2, .25, 7, 0, 1e3;
  EXPECT_EQ(table.values, expected);
}

TEST(BaseTable, OneColumnTablesWork) {
  EXPECT_EQ(parse_number_table("a\n1\n2\n", "n").values.sum(), 3);
  EXPECT_EQ(parse_table("a\nx y\n", "n").rows[0][0], "x y");
}

TEST(BaseTable, SeventeenDigitsReadBackToTheSameDouble) {
  RandomStream random(1, "table");
  Eigen::MatrixXd values(64, 16);
  for (Eigen::Index i = 0; i < values.size(); ++i) {  // any finite bit pattern
    do values(i) = std::bit_cast<double>(random.bits());
    while (!std::isfinite(values(i)));
  }
  values(0) = std::numeric_limits<double>::denorm_min();
  values(1) = std::numeric_limits<double>::max();
  Labels columns;
  for (int i = 0; i < 16; ++i) columns.push_back(fmt::format("c{}", i));
  const auto back = parse_number_table(number_table_text(columns, {}, values, 17), "round trip");
  EXPECT_EQ(back.columns, columns);
  EXPECT_EQ(back.values, values);
}

TEST(BaseTable, WritesRowLabels) {
  Eigen::MatrixXd values(2, 2);
  values << 1, 0.1, -0.0, 1e-9;
  EXPECT_EQ(number_table_text({"name", "x", "y"}, {"Fz", "Cz"}, values, 17),
            "name\tx\ty\nFz\t1\t0.10000000000000001\nCz\t0\t1.0000000000000001e-09\n");
  EXPECT_THROW(number_table_text({"x", "y"}, {"Fz", "Cz"}, values, 17), std::logic_error);
}

TEST(BaseTable, FormatsNumbers) {
  EXPECT_EQ(format_number(3.14159265), "3.14159");
  EXPECT_EQ(format_number(1e-7, 3), "1e-07");
  EXPECT_EQ(format_number(-0.0), "0");
  EXPECT_EQ(format_number(std::nan("")), "n/a");
  EXPECT_EQ(format_fixed(2.345, 1), "2.3");
  EXPECT_EQ(format_fixed(-0.04, 1), "0.0");
  EXPECT_EQ(format_fixed(-0.06, 1), "-0.1");
  EXPECT_EQ(format_fixed(1e300, 0).size(), 301u);
  EXPECT_EQ(format_fixed(std::nan(""), 1), "n/a");
}

TEST(BaseTable, WritesTableAndSideFile) {
  const Scratch scratch;
  const auto path = scratch.folder / "peaks.tsv";
  write_table(path, {"Peaks of a map",
                     {{"name", "region", ""}, {"x_mm", "position", "mm"}},
                     {{"STG", "52.0"}, {"HG", ""}}});
  EXPECT_EQ(read_file(path, "table"), "name\tx_mm\nSTG\t52.0\nHG\tn/a\n");
  const Json side = read_json(scratch.folder / "peaks.json", "side file");
  EXPECT_EQ(side.find("Description")->text(), "Peaks of a map");
  EXPECT_EQ(side.find("x_mm")->find("Units")->text(), "mm");
  EXPECT_EQ(side.find("name")->find("Units"), nullptr);
  EXPECT_THROW(write_table(path, {"", {{"a", "", ""}}, {{"x\ty"}}}), std::logic_error);
  EXPECT_THROW(write_table(path, {"", {{"a", "", ""}}, {{"x", "y"}}}), std::logic_error);
}

}  // namespace
}  // namespace headwater
