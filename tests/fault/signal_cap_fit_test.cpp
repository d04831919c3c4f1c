// SPDX-License-Identifier: GPL-3.0-or-later
// Caps that are none.
#include "base_scratch.hpp"
#include "cap_support.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/error.hpp>

#include <fmt/core.h>
#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

template <typename Body>
void expect_input_error(Body&& body, const std::vector<std::string>& words) {
  const std::string message = message_of<InputError>(body);
  for (const std::string& word : words)
    EXPECT_NE(message.find(word), std::string::npos) << "no '" << word << "' in: " << message;
}

const Labels kNine{"Fz", "F3", "F4", "Cz", "C3", "C4", "Pz", "Oz", "O1"};

std::string table_text(const Eigen::Matrix3Xd& positions, const std::string& header) {
  std::string text = header + "\n";
  for (Eigen::Index i = 0; i < positions.cols(); ++i)
    text += fmt::format("{}\t{:.10g}\t{:.10g}\t{:.10g}\n", kNine[static_cast<std::size_t>(i)],
                        positions(0, i), positions(1, i), positions(2, i));
  return text;
}

TEST(SignalCapFault, TablesThatHoldNoCap) {
  const Scratch scratch;
  const auto path = scratch.folder / "electrodes.tsv";
  const auto read = [&] { read_cap(path); };
  const std::string own = "name\tx_mm\ty_mm\tz_mm", bids = "name\tx\ty\tz";
  const Eigen::Matrix3Xd cap = standard_montage(kNine, 0.09).positions;
  write_file(path, own + "\nFz\t1\t2\t3\nCz\tn/a\tn/a\tn/a\n");
  expect_input_error(read, {"1 positions", "at least 4"});
  write_file(path, own + "\nFz\tn/a\tn/a\tn/a\nCz\tn/a\tn/a\tn/a\n");
  expect_input_error(read, {"0 positions", "n/a"});
  write_file(path, own + "\nFz\t0\t60\t60\nNz\t0\t99\t-39\nLPA\t-80\t0\t-45\nRPA\t80\t0\t-45\n");
  expect_input_error(read, {"1 electrodes beside the landmarks", "at least 4"});
  write_file(path, table_text(cap, bids));
  expect_input_error(read, {"not stated", "coordsystem.json"});
  write_file(scratch.folder / "coordsystem.json", "{\"EEGCoordinateUnits\": \"inch\"}");
  expect_input_error(read, {"\"inch\"", "\"mm\", \"cm\" or \"m\""});
  write_file(scratch.folder / "coordsystem.json", "[1, 2]");
  expect_input_error(read, {"no EEGCoordinateUnits"});
  Eigen::Matrix3Xd flat = 1e3 * cap;
  flat.row(2).setConstant(12);
  write_file(path, table_text(flat, own));
  expect_input_error(read, {"electrodes.tsv", "no sphere", "one plane"});
  write_file(path, table_text(5e3 * cap, own));
  expect_input_error(read, {"read in mm", "450 mm", "60 to 140 mm", "no unit"});
  write_file(path, table_text(1e3 * cap, own) + "FZ\t1\t2\t3\n");
  expect_input_error(read, {"more than one row"});
}

TEST(SignalCapFault, CapsWithoutAPose) {
  DigitisedCap cap = standard_cap(kNine);
  rename_all(cap);
  const auto fit = [&] { fit_cap(cap); };
  const DigitisedCap whole = cap;
  cap.right_ear.reset();
  expect_input_error(fit, {"0 have a 10-5 name", "at least 8", "LPA", "RAS", "Give the landmarks"});
  cap.axes = "LAS";  // left-handed: no rotation leads to RAS
  expect_input_error(fit, {"no right-handed axes"});
  cap = whole;
  cap.left_ear = cap.right_ear = cap.nasion;
  expect_input_error(fit, {"landmarks left out", "0 mm apart"});
  cap = whole;
  cap.nasion = (*cap.left_ear + *cap.right_ear) / 2;
  expect_input_error(fit, {"landmarks left out", "nasion 0 mm from the line"});
}

TEST(SignalCapFault, CoincidentLandmarksDoNotHinderNames) {
  DigitisedCap cap = standard_cap(kNine);
  cap.left_ear = cap.right_ear = cap.nasion;
  const CapFit fit = fit_cap(cap);
  EXPECT_EQ(fit.method, "names");
  EXPECT_TRUE(std::isnan(fit.landmark_angle_deg));
  ASSERT_EQ(fit.notes.size(), 1u);
  EXPECT_NE(fit.notes[0].find("landmarks left out"), std::string::npos);
}

TEST(SignalCapFault, SpheresThatAreNoHeads) {
  DigitisedCap cap = standard_cap(kNine);
  const Eigen::Matrix3Xd positions = cap.electrodes.positions;
  const auto fit = [&] { fit_cap(cap); };
  cap.electrodes.positions = 2 * positions;
  expect_input_error(fit, {"cap: ", "194 mm", "60 to 140 mm"});
  cap.electrodes.positions = 0.5 * positions;
  expect_input_error(fit, {"48.5 mm"});
  cap.electrodes.positions = positions;
  cap.electrodes.positions.row(0).setZero();
  expect_input_error(fit, {"cap: no sphere", "one plane"});
  cap.electrodes.positions = Eigen::Matrix3Xd::Constant(3, 9, 0.05);
  expect_input_error(fit, {"cap: no sphere"});
  cap.electrodes.positions = positions;
  cap.electrodes.positions(1, 4) = std::nan("");
  expect_input_error(fit, {"not a finite number"});
  cap.electrodes = standard_montage({"Fz", "Cz", "Pz"}, 0.09);
  expect_input_error(fit, {"3 electrodes", "at least 4"});
}

}  // namespace
}  // namespace headwater
