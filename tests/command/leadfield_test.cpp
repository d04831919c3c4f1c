// SPDX-License-Identifier: GPL-3.0-or-later
// headwater leadfield: what stands in the table is what the library computes, to the last bit.
#include "base_scratch.hpp"
#include "program.hpp"

#include <headwater/base/table.hpp>
#include <headwater/base/units.hpp>
#include <headwater/model/lead_field.hpp>
#include <headwater/signal/reference.hpp>

#include <gtest/gtest.h>

namespace headwater {
namespace {

const char* const kElectrodes =
    "name\tx_mm\ty_mm\tz_mm\n"
    "front\t0\t90\t20\n"
    "left\t-88.5\t3\t1\n"
    "right\t88.5\t3\t1\n"
    "back\t1.25\t-91\t-4\n"
    "top\t0\t0\t92\n";
const char* const kPoints =
    "z_mm\tname\tx_mm\ty_mm\n"  // in any order of columns
    "31.4159265358979\ta\t40.1\t-12.7\n"
    "0\tcentre\t0\t0\n"
    "71.5\tb\t-3\t2\n";

struct Folder {
  Scratch scratch;
  std::filesystem::path folder = scratch.folder / "in";
  std::vector<std::string> arguments{
      "leadfield",        "--electrodes", "electrodes.tsv", "--points",
      "points.tsv",       "--radii-mm",   "80,85,92",       "--conductivity-S-per-m",
      "0.33,0.0132,0.33", "--output",     "gain.tsv"};
  Folder() {
    write_file(folder / "electrodes.tsv", kElectrodes);
    write_file(folder / "points.tsv", kPoints);
  }
  std::string& option(const std::string& name) {
    for (std::size_t i = 0; i + 1 < arguments.size(); ++i)
      if (arguments[i] == name) return arguments[i + 1];
    arguments.push_back(name);
    return arguments.emplace_back();
  }
  ProgramRun run() const { return run_program(arguments, folder); }
  Table gain() const { return read_table(folder / "gain.tsv", "lead field"); }
};

Eigen::Matrix3Xd places_m(const std::filesystem::path& path) {
  const Table table = read_table(path, "places");
  Eigen::Matrix3Xd places(3, static_cast<Eigen::Index>(table.rows.size()));
  for (std::size_t row = 0; row < table.rows.size(); ++row) {
    int axis = 0;
    for (const char* column : {"x_mm", "y_mm", "z_mm"})
      places(axis++, static_cast<Eigen::Index>(row)) =
          table.number(row, table.column(column)) * kMillimetre;
  }
  return places;
}

Eigen::MatrixXd numbers_of(const Table& table) {
  Eigen::MatrixXd values(static_cast<Eigen::Index>(table.rows.size()),
                         static_cast<Eigen::Index>(table.columns.size()) - 1);
  for (Eigen::Index m = 0; m < values.rows(); ++m)
    for (Eigen::Index k = 0; k < values.cols(); ++k)
      values(m, k) = table.number(static_cast<std::size_t>(m), static_cast<std::size_t>(k + 1));
  return values;
}

HeadModel shells(const std::vector<double>& radii_mm, const std::vector<double>& conductivity) {
  const auto count = static_cast<Eigen::Index>(radii_mm.size());
  return {Eigen::Map<const Eigen::VectorXd>(radii_mm.data(), count) * kMillimetre,
          Eigen::Map<const Eigen::VectorXd>(conductivity.data(), count)};
}

TEST(CommandLeadfield, TheTableReadsBackToTheLibrarysNumbers) {
  const Folder in;
  const ProgramRun run = in.run();
  ASSERT_EQ(run.exit_code, 0) << run.err;
  const Table table = in.gain();
  EXPECT_EQ(table.columns, (Labels{"name", "a_x", "a_y", "a_z", "centre_x", "centre_y", "centre_z",
                                   "b_x", "b_y", "b_z"}));
  Labels names;
  for (const auto& row : table.rows) names.push_back(row[0]);
  EXPECT_EQ(names, (Labels{"front", "left", "right", "back", "top"}));
  const Eigen::MatrixXd expected =
      compute_gain(shells({80, 85, 92}, {0.33, 0.0132, 0.33}),
                   places_m(in.folder / "electrodes.tsv"), places_m(in.folder / "points.tsv"));
  EXPECT_EQ(numbers_of(table), expected);
  EXPECT_GT(expected.cwiseAbs().maxCoeff(), 10);  // V/(A m): 1 nA m gives tens of nV
}

TEST(CommandLeadfield, AverageReferenceHasNoSumOverElectrodes) {
  Folder in;
  in.option("--reference") = "average";
  const ProgramRun run = in.run();
  ASSERT_EQ(run.exit_code, 0) << run.err;
  const Eigen::MatrixXd gain = numbers_of(in.gain());
  const double largest = gain.cwiseAbs().maxCoeff();
  EXPECT_LT(gain.colwise().sum().cwiseAbs().maxCoeff(), 5 * 5 * 1.2e-16 * largest);
  const Eigen::MatrixXd free =
      compute_gain(shells({80, 85, 92}, {0.33, 0.0132, 0.33}),
                   places_m(in.folder / "electrodes.tsv"), places_m(in.folder / "points.tsv"));
  EXPECT_LT((gain - average_reference(5) * free).cwiseAbs().maxCoeff(), 1e-14 * largest);
}

TEST(CommandLeadfield, TakesAnyNumberOfShells) {
  for (const auto& [radii, sigma, count] : {std::tuple{"92", "0.33", 1},
                                            {"80,92", "0.33,0.02", 2},
                                            {"78,80,86,92", "0.33,1.79,0.0132,0.43", 4}}) {
    Folder in;
    in.option("--radii-mm") = radii;
    in.option("--conductivity-S-per-m") = sigma;
    const ProgramRun run = in.run();
    ASSERT_EQ(run.exit_code, 0) << run.err;
    const std::vector<double> r = count == 1   ? std::vector<double>{92}
                                  : count == 2 ? std::vector<double>{80, 92}
                                               : std::vector<double>{78, 80, 86, 92};
    const std::vector<double> s = count == 1   ? std::vector<double>{0.33}
                                  : count == 2 ? std::vector<double>{0.33, 0.02}
                                               : std::vector<double>{0.33, 1.79, 0.0132, 0.43};
    EXPECT_EQ(numbers_of(in.gain()),
              compute_gain(shells(r, s), places_m(in.folder / "electrodes.tsv"),
                           places_m(in.folder / "points.tsv")));
  }
}

/// Runs with one thing wrong: nothing must be written, and the message must name it.
void expect_refused(Folder& in, int code, const std::vector<std::string>& parts) {
  const ProgramRun run = in.run();
  EXPECT_EQ(run.exit_code, code) << run.err;
  expect_said(run.err, parts);
  EXPECT_EQ(run.out, "");
  EXPECT_EQ(files_below(in.folder).size(), 2u);  // the inputs
}

TEST(CommandLeadfield, WrongOptionsAreRefused) {
  for (const auto& [option, value, part] : {std::tuple{"--reference", "mastoids", "--reference"},
                                            {"--radii-mm", "80,eighty,92", "--radii-mm"},
                                            {"--radii-mm", "80,92", "3"},
                                            {"--radii-mm", "80,75,92", "75"},
                                            {"--radii-mm", "0.080,0.085,0.092", "mm"},
                                            {"--conductivity-S-per-m", "0.33,-1,0.33", "-1"},
                                            {"--shells", "3", "--shells"}}) {
    Folder in;
    in.option(option) = value;
    expect_refused(in, 2, {part});
  }
  Folder in;
  in.arguments.resize(5);
  expect_refused(in, 2, {"is required"});
}

TEST(CommandLeadfield, WrongTablesAreRefusedWithTheirPlace) {
  const auto refuse = [](const char* file, const std::string& text,
                         const std::vector<std::string>& parts) {
    Folder in;
    write_file(in.folder / file, text);
    expect_refused(in, 3, parts);
  };
  refuse("electrodes.tsv", with(kElectrodes, "-88.5", "n/a"),
         {"electrodes.tsv", "line 3", "x_mm", "'n/a'"});
  refuse("electrodes.tsv", with(kElectrodes, "left", "front"), {"electrodes.tsv", "front"});
  refuse("electrodes.tsv", with(kElectrodes, "z_mm", "z"), {"electrodes.tsv", "z_mm"});
  refuse("points.tsv", with(kPoints, "\t-12.7", ""), {"points.tsv", "line 2", "4"});
  refuse("points.tsv", with(kPoints, "-12.7", "12,7"), {"points.tsv", "line 2", "y_mm", "'12,7'"});
  refuse("points.tsv", "", {"points.tsv"});
  refuse("points.tsv", "name\tx_mm\ty_mm\tz_mm\n", {"points.tsv"});
}

TEST(CommandLeadfield, PointsOutsideTheBrainAreNamedAllAtOnce) {
  Folder in;
  write_file(in.folder / "points.tsv", with(with(kPoints, "71.5\tb", "81\tb"), "31.4", "131.4"));
  write_file(in.folder / "electrodes.tsv", with(kElectrodes, "0\t0\t92", "0\t0\t0"));
  expect_refused(in, 3,
                 {"point 'a' lies 137.", "point 'b' lies 81.", "(80 mm)",
                  "electrode 'top' lies at the origin", "points.tsv", "electrodes.tsv"});
}

TEST(CommandLeadfield, AnUnwritableOutputIsAFailedResource) {
  Folder in;
  in.option("--output") = "points.tsv/gain.tsv";
  expect_refused(in, 5, {"points.tsv/gain.tsv", "cannot be written"});
}

}  // namespace
}  // namespace headwater
