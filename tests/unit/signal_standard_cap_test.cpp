// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/signal/standard_cap.hpp>

#include <gtest/gtest.h>

#include <set>

namespace headwater {
namespace {

TEST(SignalStandardCap, KnowsEveryNameOnce) {
  const Labels& names = standard_names();
  // Oostenveld & Praamstra 2001: 345 sites. 15 rows of 21 and 6 of 5.
  EXPECT_EQ(names.size(), 345u);
  EXPECT_EQ(std::set<std::string>(names.begin(), names.end()).size(), names.size());
  for (const char* name :
       {"Nz",    "N1h",   "NFp2", "Fp1h", "Fpz",  "AFp7", "AFp10h", "AF1",   "AFF5h", "F9",
        "FFT7h", "FFC5h", "FT7",  "FT10", "FC5",  "FTT8", "FCC4h",  "T7h",   "T9",    "C5h",
        "C1",    "TTP9h", "CCP3", "TP8",  "TP10", "CP6h", "TPP7",   "CPP1h", "P9",    "PPO10h",
        "PO1",   "PO7",   "POO3", "Oz",   "O2h",  "OI1",  "OIz",    "Iz",    "I2h"})
    EXPECT_EQ(standard_name(name), name);
  for (const char* name : {"C7", "FC7", "CP9h", "T5h", "M1", "A2", "LPA", "nd", "", "Cz "})
    EXPECT_EQ(standard_name(name), "") << name;
}

TEST(SignalStandardCap, TakesAnyCaseAndOldNames) {
  EXPECT_EQ(standard_name("FCZ"), "FCz");
  EXPECT_EQ(standard_name("nfp1h"), "NFp1h");
  EXPECT_EQ(standard_name("T3"), "T7");
  EXPECT_EQ(standard_name("t4"), "T8");
  EXPECT_EQ(standard_direction("T5").value(), standard_direction("P7").value());
  EXPECT_EQ(standard_direction("T6").value(), standard_direction("p8").value());
}

TEST(SignalStandardCap, IsMirroredToTheLastBit) {
  for (const std::string& name : standard_names()) {
    const Eigen::Vector3d u = standard_direction(name).value();
    EXPECT_NEAR(u.norm(), 1, 1e-15) << name;
    const auto digit = name.find_first_of("0123456789");
    if (digit == std::string::npos) {
      EXPECT_EQ(u.x(), 0) << name;
      continue;
    }
    const int number = std::stoi(name.substr(digit));
    EXPECT_EQ(number % 2 == 1, u.x() < 0) << name;  // odd: left
    const bool half = name.back() == 'h';
    const std::string other = name.substr(0, digit) +
                              std::to_string(number % 2 ? number + 1 : number - 1) +
                              (half ? "h" : "");
    const Eigen::Vector3d v = standard_direction(other).value();
    EXPECT_EQ(v.x(), -u.x()) << name;
    EXPECT_EQ(v.y(), u.y()) << name;
    EXPECT_EQ(v.z(), u.z()) << name;
  }
}

TEST(SignalStandardCap, ListsFrontToBackAndLeftToRight) {
  const Labels& names = standard_names();
  EXPECT_EQ(names.front(), "N1");
  EXPECT_EQ(names.back(), "I2");
  const auto start = names.begin() + *find_label(names, "FT9");
  EXPECT_EQ(Labels(start, start + 21),
            (Labels{"FT9",  "FT9h", "FT7",  "FT7h", "FC5",  "FC5h",  "FC3",
                    "FC3h", "FC1",  "FC1h", "FCz",  "FC2h", "FC2",   "FC4h",
                    "FC4",  "FC6h", "FC6",  "FT8h", "FT8",  "FT10h", "FT10"}));
  EXPECT_LT(find_label(names, "Fz").value(), find_label(names, "Pz").value());
}

}  // namespace
}  // namespace headwater
