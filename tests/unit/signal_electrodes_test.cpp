// SPDX-License-Identifier: GPL-3.0-or-later
#include "base_scratch.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/error.hpp>
#include <headwater/model/head.hpp>
#include <headwater/signal/electrodes.hpp>
#include <headwater/signal/standard_cap.hpp>

#include <fmt/core.h>
#include <gtest/gtest.h>

#include <algorithm>

namespace headwater {
namespace {

const Labels kTen{"Fp1", "Fp2", "F3", "F4", "C3", "C4", "P3", "P4", "O1", "O2"};

std::string positions_text(const std::string& header, double per_metre, const Labels& labels,
                           const Eigen::Vector3d& shift_m = Eigen::Vector3d::Zero()) {
  std::string text = header + "\n";
  const Montage cap = standard_montage(labels, 0.09);
  for (std::size_t i = 0; i < labels.size(); ++i) {
    const Eigen::Vector3d p =
        (cap.positions.col(static_cast<Eigen::Index>(i)) + shift_m) * per_metre;
    text += fmt::format("{}\t{:.10g}\t{:.10g}\t{:.10g}\n", labels[i], p.x(), p.y(), p.z());
  }
  return text;
}

TEST(SignalElectrodes, PlansDropRenameAndZero) {
  Labels file = kTen;
  file.insert(file.begin(), "X");
  file.push_back("AF1");
  const ChannelPlan plan =
      plan_channels(file, {{"x", "O2"}, {{"AF1", "AF3"}, {"Fp1", "Fpz"}}, {"Cz"}}, "a.tsv");
  EXPECT_EQ(plan.labels,
            (Labels{"Fpz", "Fp2", "F3", "F4", "C3", "C4", "P3", "P4", "O1", "AF3", "Cz"}));
  EXPECT_EQ(plan.source, (std::vector<Eigen::Index>{1, 2, 3, 4, 5, 6, 7, 8, 9, 11, -1}));
}

TEST(SignalElectrodes, RenamesMaySwapNames) {
  const ChannelPlan plan = plan_channels(kTen, {{}, {{"C3", "C4"}, {"C4", "C3"}}, {}}, "a.tsv");
  EXPECT_EQ(plan.labels[4], "C4");
  EXPECT_EQ(plan.labels[5], "C3");
}

TEST(SignalElectrodes, DropsTheExactSpellingFirst) {
  Labels file = kTen;
  file.push_back("fp1");
  const ChannelPlan plan = plan_channels(file, {{"fp1"}, {}, {}}, "a.tsv");
  EXPECT_EQ(plan.labels, kTen);
}

TEST(SignalElectrodes, StandardMontageHasTheRadius) {
  const Montage montage = standard_montage({"CZ", "t3", "Oz", "Fpz"}, 0.092);
  EXPECT_EQ(montage.labels, (Labels{"CZ", "t3", "Oz", "Fpz"}));
  for (Eigen::Index i = 0; i < 4; ++i) EXPECT_NEAR(montage.positions.col(i).norm(), 0.092, 1e-16);
  EXPECT_TRUE(montage.positions.col(1).isApprox(0.092 * *standard_direction("T7"), 1e-15));
}

TEST(SignalElectrodes, ReadsMillimetresByColumnName) {
  const Scratch scratch;
  const auto path = scratch.folder / "cap.tsv";
  write_file(path, positions_text("name\tx_mm\ty_mm\tz_mm", 1e3, kTen));
  const Montage montage = read_positions(path, PositionSpace::head);
  EXPECT_EQ(montage.labels, kTen);
  // Ten digits are written.
  EXPECT_LT((montage.positions - standard_montage(kTen, 0.09).positions).cwiseAbs().maxCoeff(),
            1e-10);
}

TEST(SignalElectrodes, SubtractsTheHeadCentreInMniSpace) {
  const Scratch scratch;
  const auto path = scratch.folder / "cap.tsv";
  write_file(path, positions_text("name\tx_mm\ty_mm\tz_mm", 1e3, kTen, kHeadCentreMni));
  const Montage montage = read_positions(path, PositionSpace::mni);
  EXPECT_LT((montage.positions - standard_montage(kTen, 0.09).positions).cwiseAbs().maxCoeff(),
            1e-10);
}

TEST(SignalElectrodes, ReadsBidsTablesInEveryUnit) {
  for (const auto& [unit, per_metre] : {std::pair{"mm", 1e3}, {"cm", 1e2}, {"m", 1.0}}) {
    for (const char* side_file : {"sub-01_coordsystem.json", "coordsystem.json"}) {
      const Scratch scratch;
      const auto path = scratch.folder / "sub-01_electrodes.tsv";
      write_file(path, "\xef\xbb\xbf" + positions_text("name\tx\ty\tz", per_metre, kTen) +
                           "Cz\tn/a\tn/a\tn/a\n");
      write_file(scratch.folder / side_file,
                 fmt::format("{{\"EEGCoordinateUnits\": \"{}\"}}", unit));
      const Montage montage = read_positions(path, PositionSpace::head);
      EXPECT_EQ(montage.labels, kTen);  // the row without a position is left out
      EXPECT_LT((montage.positions - standard_montage(kTen, 0.09).positions).cwiseAbs().maxCoeff(),
                1e-10);
    }
  }
}

TEST(SignalElectrodes, SelectsByNameInTheOrderAsked) {
  const Montage table = standard_montage(kTen, 0.09);
  const Montage montage = select_positions(table, {"o2", "FP1"}, "cap.tsv");
  EXPECT_EQ(montage.labels, (Labels{"o2", "FP1"}));
  EXPECT_EQ(montage.positions.col(0), table.positions.col(9));
  EXPECT_EQ(montage.positions.col(1), table.positions.col(0));
}

TEST(SignalElectrodes, FitsTheSphereItWasMadeOf) {
  Montage montage = standard_montage(standard_names(), 0.092);
  const Eigen::Vector3d centre(0.004, -0.01, 0.02);
  montage.positions.colwise() += centre;
  const SphereFit fit = fit_head_sphere(montage);
  EXPECT_TRUE(fit.converged);
  EXPECT_NEAR(fit.radius, 0.092, 1e-12);
  EXPECT_LT((fit.centre - centre).norm(), 1e-12);
}

TEST(SignalElectrodes, NeighboursAreThoseNextOnTheCap) {
  const Labels labels{"Fp1", "Fpz", "Fp2", "F7", "F3", "Fz", "F4", "F8", "T7", "C3", "Cz",
                      "C4",  "T8",  "P7",  "P3", "Pz", "P4", "P8", "O1", "Oz", "O2"};
  const auto neighbours = channel_neighbours(standard_montage(labels, 0.092));
  ASSERT_EQ(neighbours.size(), labels.size());
  const auto linked = [&](const char* a, const char* b) {
    const auto& list = neighbours[static_cast<std::size_t>(*find_label(labels, a))];
    return std::find(list.begin(), list.end(), *find_label(labels, b)) != list.end();
  };
  for (const auto& [a, b] :
       {std::pair{"Cz", "C3"}, {"Cz", "Fz"}, {"F3", "F7"}, {"T7", "C3"}, {"Fp1", "Fpz"}}) {
    EXPECT_TRUE(linked(a, b)) << a << " " << b;
    EXPECT_TRUE(linked(b, a)) << a << " " << b;
  }
  // Below the rim of the cap nothing joins the two sides.
  for (const auto& [a, b] : {std::pair{"T7", "T8"}, {"Fpz", "Oz"}, {"F7", "P8"}, {"Cz", "T7"}})
    EXPECT_FALSE(linked(a, b)) << a << " " << b;
}

}  // namespace
}  // namespace headwater
