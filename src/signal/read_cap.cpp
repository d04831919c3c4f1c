// SPDX-License-Identifier: GPL-3.0-or-later
// A digitised cap from its table and its coordsystem.json. Units are checked against the size of a
// head: a sphere through the electrodes has a radius of 60 to 140 mm, and landmarks stand within
// 0.4 to 2 radii of its centre (1.0 to 1.1 on the template head). The units differ by factors of
// ten, so that at most one fits.
#include "cap_rotation.hpp"
#include "position_table.hpp"
#include "robust_sphere.hpp"

#include <headwater/base/error.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/cap_fit.hpp>

#include <fmt/core.h>

#include <array>
#include <cctype>
#include <stdexcept>
#include <string_view>
#include <utility>

namespace headwater {
namespace {

using Point = std::optional<Eigen::Vector3d>;
using Landmarks = std::array<Point, 3>;  // nasion, left ear, right ear

int landmark_of(std::string_view name) {
  const std::string folded = fold_case(name);
  if (folded == "nas" || folded == "nz" || folded == "nasion") return 0;
  return folded == "lpa" ? 1 : folded == "rpa" ? 2 : -1;
}

bool complete(const Landmarks& landmarks) {
  return landmarks[0] && landmarks[1] && landmarks[2];
}

/// Takes the landmarks out of the electrodes.
Landmarks split_landmarks(Montage& montage) {
  Landmarks landmarks;
  std::vector<Eigen::Index> electrodes;
  Labels labels;
  for (std::size_t i = 0; i < montage.labels.size(); ++i) {
    const auto column = static_cast<Eigen::Index>(i);
    if (const int which = landmark_of(montage.labels[i]); which >= 0) {
      landmarks[static_cast<std::size_t>(which)] = montage.positions.col(column);
    } else {
      electrodes.push_back(column);
      labels.push_back(montage.labels[i]);
    }
  }
  const Eigen::Matrix3Xd positions = montage.positions(Eigen::all, electrodes);
  montage = {labels, positions};
  return landmarks;
}

Point point(const Json& json) {
  if (!json.is_array() || json.items().size() != 3) return std::nullopt;
  Eigen::Vector3d found;
  for (std::size_t i = 0; i < 3; ++i) {
    try {
      found[static_cast<Eigen::Index>(i)] = json.items()[i].number();
    } catch (const std::logic_error&) {
      return std::nullopt;
    }
  }
  return found.allFinite() ? Point(found) : std::nullopt;
}

std::string text_member(const Json& json, std::string_view key) {
  const Json* found = json.is_object() ? json.find(key) : nullptr;
  if (!found) return "";
  try {
    return found->text();
  } catch (const std::logic_error&) {
    return "";
  }
}

/// What the side file calls `key` (AnatomicalLandmark or Fiducials), in its own unit.
Landmarks listed_landmarks(const Json& side, const std::string& key) {
  Landmarks landmarks;
  const Json* listed = side.find(key + "Coordinates");
  if (!listed || !listed->is_object()) return landmarks;
  for (const auto& [name, value] : listed->members())
    if (const int which = landmark_of(name); which >= 0)
      landmarks[static_cast<std::size_t>(which)] = point(value);
  return landmarks;
}

/// Brings the electrodes to metres; the sphere through them.
SphereFit to_metres(Montage& montage, LengthUnit& unit, const std::string& source, Labels& notes) {
  const Eigen::Matrix3Xd raw = montage.positions;
  const LengthUnit stated = unit;
  SphereFit head = fit_head(raw * unit.metres, source).fit;
  const double stated_mm = head.radius / kMillimetre;
  for (const LengthUnit& other : kLengthUnits) {
    if (is_head_radius(head.radius)) break;
    head = fit_head(raw * other.metres, source).fit;
    unit = other;
  }
  if (!is_head_radius(head.radius))
    throw InputError(
        fmt::format("{}: read in {}, the electrodes lie on a sphere of radius {:.4g} mm, expected "
                    "60 to 140 mm; no unit (mm, cm, m) would make a head of them.",
                    source, stated.name, stated_mm));
  if (unit.name != stated.name)
    notes.push_back(
        fmt::format("the stated unit of the electrodes is {}, but in it they would lie on a sphere "
                    "of radius {:.4g} mm: read in {}, radius {:.0f} mm",
                    stated.name, stated_mm, unit.name, head.radius / kMillimetre));
  montage.positions = raw * unit.metres;
  return head;
}

bool on_a_head(const Landmarks& landmarks, double metres, const SphereFit& sphere) {
  for (const Point& landmark : landmarks) {
    if (!landmark) continue;
    const double distance = (*landmark * metres - sphere.centre).norm();
    if (distance < 0.4 * sphere.radius || distance > 2 * sphere.radius) return false;
  }
  return true;
}

/// Landmarks of the side file in m, in the electrodes' frame; empty, with a note, where they cannot
/// be that.
Landmarks side_landmarks(const Json& side, const LengthUnit& electrodes_unit,
                         const SphereFit& sphere, Labels& notes) {
  for (const std::string key : {"AnatomicalLandmark", "Fiducials"}) {
    Landmarks landmarks = listed_landmarks(side, key);
    if (!complete(landmarks)) continue;
    const std::string system = text_member(side, key + "CoordinateSystem");
    const std::string own = text_member(side, "EEGCoordinateSystem");
    if (!system.empty() && fold_case(system) != fold_case(own)) {
      notes.push_back(
          fmt::format("{}Coordinates left out: they are in the system '{}', the "
                      "electrodes in '{}'",
                      key, system, own));
      continue;
    }
    const Json* unit = side.find(key + "CoordinateUnits");
    const LengthUnit stated = unit ? length_unit(*unit).value_or(electrodes_unit) : electrodes_unit;
    std::optional<LengthUnit> used;
    for (const LengthUnit& unit_tried :
         {stated, electrodes_unit, kLengthUnits[0], kLengthUnits[1], kLengthUnits[2]})
      if (!used && on_a_head(landmarks, unit_tried.metres, sphere)) used = unit_tried;
    if (!used) {
      notes.push_back(fmt::format(
          "{}Coordinates left out: in no unit (mm, cm, m) do they stand on the head", key));
      continue;
    }
    if (used->name != stated.name)
      notes.push_back(
          fmt::format("the stated unit of {}Coordinates is {}, but only in {} do they "
                      "stand on the head: read in {}",
                      key, stated.name, used->name, used->name));
    for (Point& landmark : landmarks) *landmark *= used->metres;
    return landmarks;
  }
  return {};
}

/// Axes such as RAS where the side file names them, once or always the same.
std::string axes_in(const std::string& text) {
  std::string found, word;
  for (const char letter : text + " ") {
    if (std::isalnum(static_cast<unsigned char>(letter))) {
      word += letter;
      continue;
    }
    if (stated_axes(word)) {
      if (!found.empty() && found != word) return "";
      found = word;
    }
    word.clear();
  }
  return found;
}

}  // namespace

DigitisedCap read_cap(const std::filesystem::path& path) {
  PositionTable table = read_position_table(path);
  DigitisedCap cap;
  cap.source = table.source;
  cap.without_position = table.without_position;
  cap.electrodes = std::move(table.rows);
  Landmarks landmarks = split_landmarks(cap.electrodes);
  if (cap.electrodes.labels.size() < 4)
    throw InputError(fmt::format("{}: {} electrodes beside the landmarks, at least 4 are needed.",
                                 cap.source, cap.electrodes.labels.size()));
  const SphereFit sphere = to_metres(cap.electrodes, table.unit, cap.source, cap.notes);
  for (Point& landmark : landmarks)
    if (landmark) *landmark *= table.unit.metres;
  if (table.side.is_object()) {
    if (!complete(landmarks)) landmarks = side_landmarks(table.side, table.unit, sphere, cap.notes);
    cap.coordinate_system = text_member(table.side, "EEGCoordinateSystem");
    cap.axes = axes_in(cap.coordinate_system + " " +
                       text_member(table.side, "EEGCoordinateSystemDescription"));
  }
  cap.nasion = landmarks[0];
  cap.left_ear = landmarks[1];
  cap.right_ear = landmarks[2];
  return cap;
}

}  // namespace headwater
