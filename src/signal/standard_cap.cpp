// SPDX-License-Identifier: GPL-3.0-or-later
// Derivation. A row at p % of the way from nasion to inion has its midline site at elevation
// 2.25 (p - 10) degrees from Fpz (Fpz 0, Cz 90, Oz 180) and its ring site at azimuth 1.8 p degrees
// from Fpz (Fp1 18, T7 90, O1 162). Let M be the midline site, (-a, H) the left ring site with H in
// the plane x = 0, h = |M - H| and v = (M - H)/h. The circle through M and both ring sites lies in
// the plane of v and the x axis; its radius is r = (a^2 + h^2)/(2h), its centre M - r v, and the
// ring site stands at the angle A = atan2(a, r - h) from M. The site at the fraction f of the arc
// is therefore
//   M - r (1 - cos fA) v -+ r sin(fA) e_x.
// Only left sites are computed; right ones are their copies with x negated, so that the cap is
// mirrored to the last bit.
#include <headwater/base/units.hpp>
#include <headwater/signal/standard_cap.hpp>

#include <array>
#include <cmath>
#include <map>
#include <string>
#include <vector>

namespace headwater {
namespace {

constexpr double kDegree = kPi / 180;
constexpr double kPitch = -4.4 * kDegree;      // about x: Fpz goes down
constexpr double kBelowRing = 22.5 * kDegree;  // column 9; column 9h half of it
constexpr int kRingColumn = 8;                 // steps of 12.5 % from the midline to the ring

/// Left columns from the midline outwards; the right ones are the next even numbers.
constexpr std::array<std::string_view, 10> kLeft{"1h", "1",  "3h", "3",  "5h",
                                                 "5",  "7h", "7",  "9h", "9"};
constexpr std::array<std::string_view, 10> kRight{"2h", "2",  "4h", "4",   "6h",
                                                  "6",  "8h", "8",  "10h", "10"};

struct Row {
  std::string_view name;     // columns z to 5
  std::string_view lateral;  // columns 7h to 9: named for the temporal lobe in the middle rows
  double percent;            // of the way from nasion to inion
};
constexpr std::array<Row, 15> kInnerRows{{{"AFp", "AFp", 15},
                                          {"AF", "AF", 20},
                                          {"AFF", "AFF", 25},
                                          {"F", "F", 30},
                                          {"FFC", "FFT", 35},
                                          {"FC", "FT", 40},
                                          {"FCC", "FTT", 45},
                                          {"C", "T", 50},
                                          {"CCP", "TTP", 55},
                                          {"CP", "TP", 60},
                                          {"CPP", "TPP", 65},
                                          {"P", "P", 70},
                                          {"PPO", "PPO", 75},
                                          {"PO", "PO", 80},
                                          {"POO", "POO", 85}}};

struct Site {
  std::string name;
  Eigen::Vector3d direction;
};

/// Direction before the pitch: azimuth from the front to the left, elevation above the ring.
Eigen::Vector3d left_direction(double azimuth, double elevation) {
  return {-std::sin(azimuth) * std::cos(elevation), std::cos(azimuth) * std::cos(elevation),
          std::sin(elevation)};
}

Eigen::Vector3d pitched(const Eigen::Vector3d& u) {
  const double c = std::cos(kPitch), s = std::sin(kPitch);
  return Eigen::Vector3d(u.x(), c * u.y() - s * u.z(), s * u.y() + c * u.z()).normalized();
}

/// One row from its left sites (midline outwards) and the names of both sides, left to right.
void append_row(std::vector<Site>& sites, const Site& midline, const std::vector<Site>& left,
                const Labels& right_names) {
  for (std::size_t k = left.size(); k-- > 0;)
    sites.push_back({left[k].name, pitched(left[k].direction)});
  Eigen::Vector3d middle = pitched(midline.direction);
  middle.x() = 0;  // never -0
  sites.push_back({midline.name, middle});
  for (std::size_t k = 0; k < left.size(); ++k) {
    Eigen::Vector3d mirrored = pitched(left[k].direction);
    mirrored.x() = -mirrored.x();
    sites.push_back({right_names[k], mirrored});
  }
}

/// Rows before the first and after the last inner row: midline and 5 % and 10 % of the ring beside
/// it, at an elevation.
void append_polar_row(std::vector<Site>& sites, const std::string& row, bool front,
                      double elevation) {
  const auto at = [&](double from_midline) {
    return left_direction(front ? from_midline : kPi - from_midline, elevation);
  };
  append_row(sites, {row + "z", at(0)},
             {{row + "1h", at(9 * kDegree)}, {row + "1", at(18 * kDegree)}},
             {row + "2h", row + "2"});
}

void append_inner_row(std::vector<Site>& sites, const Row& row) {
  const double azimuth = 1.8 * kDegree * row.percent;
  const double elevation = 2.25 * kDegree * (row.percent - 10);
  const Eigen::Vector3d midline(0, std::cos(elevation), std::sin(elevation));
  const Eigen::Vector3d ring = left_direction(azimuth, 0);
  const Eigen::Vector3d chord = midline - Eigen::Vector3d(0, ring.y(), 0);
  const double a = -ring.x(), h = chord.norm(), radius = (a * a + h * h) / (2 * h);
  const double arc = std::atan2(a, radius - h);
  std::vector<Site> left;
  Labels right_names;
  for (int k = 1; k <= static_cast<int>(kLeft.size()); ++k) {
    const double angle = arc * k / kRingColumn;
    const Eigen::Vector3d direction =
        k <= kRingColumn ? Eigen::Vector3d(midline - radius * (1 - std::cos(angle)) / h * chord -
                                           radius * std::sin(angle) * Eigen::Vector3d::UnitX())
                         : left_direction(azimuth, -kBelowRing * (k - kRingColumn) / 2);
    const std::string letters(k >= 7 ? row.lateral : row.name);
    const auto column = static_cast<std::size_t>(k - 1);
    left.push_back({letters + std::string(kLeft[column]), direction});
    right_names.push_back(letters + std::string(kRight[column]));
  }
  append_row(sites, {std::string(row.name) + "z", midline}, left, right_names);
}

std::vector<Site> build_sites() {
  std::vector<Site> sites;
  append_polar_row(sites, "N", true, -kBelowRing);
  append_polar_row(sites, "NFp", true, -kBelowRing / 2);
  append_polar_row(sites, "Fp", true, 0);
  for (const Row& row : kInnerRows) append_inner_row(sites, row);
  append_polar_row(sites, "O", false, 0);
  append_polar_row(sites, "OI", false, -kBelowRing / 2);
  append_polar_row(sites, "I", false, -kBelowRing);
  return sites;
}

/// The sites and where each folded name stands; names of the older 10-20 system lead to the new
/// ones.
struct Cap {
  std::vector<Site> sites = build_sites();
  Labels names;
  std::map<std::string, std::size_t, std::less<>> index;

  Cap() {
    for (std::size_t i = 0; i < sites.size(); ++i) {
      names.push_back(sites[i].name);
      index.emplace(fold_case(sites[i].name), i);
    }
    for (const auto& [old_name, name] :
         {std::pair{"t3", "t7"}, {"t4", "t8"}, {"t5", "p7"}, {"t6", "p8"}})
      index.emplace(old_name, index.at(name));
  }
  const Site* find(std::string_view name) const {
    const auto found = index.find(fold_case(name));
    return found == index.end() ? nullptr : &sites[found->second];
  }
};

const Cap& cap() {
  static const Cap instance;
  return instance;
}

}  // namespace

std::optional<Eigen::Vector3d> standard_direction(std::string_view name) {
  const Site* site = cap().find(name);
  return site ? std::optional(site->direction) : std::nullopt;
}

std::string standard_name(std::string_view name) {
  const Site* site = cap().find(name);
  return site ? site->name : std::string();
}

const Labels& standard_names() {
  return cap().names;
}

}  // namespace headwater
