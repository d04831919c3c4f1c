// SPDX-License-Identifier: GPL-3.0-or-later
// Exchanges. Q is the matrix by names, a rotation or a mirrored one (improper), whichever fits; in
// its coordinates the names' front is +y and their right +x, whatever was exchanged. Against them
// stand the digitised nasion and ears:
//   improper  nasion behind  ears crossed   what happened                          mirrored
//   reversed no        no             no             nothing                                no no
//   yes       no             no             axes of the table mirrored             yes      no
//   yes       no             yes            names of left and right exchanged      yes      no
//   no        no             yes            both, or the ears exchanged            yes      no
//   no        yes            yes            cap or its names turned by half        no       yes
//   no        yes            no             nasion and inion exchanged             no       yes
//   yes       yes            no             names of front and back exchanged      no       yes
//   yes       yes            yes            turned and mirrored                    yes      yes
// An improper Q is made a rotation by the mirror that undoes the exchange: x, or y where only front
// and back are exchanged.
#include "cap_rotation.hpp"
#include "robust_sphere.hpp"

#include <headwater/base/error.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/cap_fit.hpp>
#include <headwater/signal/standard_cap.hpp>

#include <Eigen/Geometry>
#include <fmt/core.h>

#include <cmath>
#include <limits>

namespace headwater {
namespace {

constexpr Eigen::Index kEnoughNames = 8;
// Mirrored: the mirror image fits twice as well, and the cap as it stands fits worse than any real
// one (mean angles of four real caps: 3 to 5 degrees).
constexpr double kMirrorGain = 0.5, kMirrorLeastDeg = 10;
constexpr double kReversedDeg = 120;
constexpr double kDisagreeDeg = 20;  // names against landmarks: worth a note
constexpr double kNaN = std::numeric_limits<double>::quiet_NaN();

/// Electrodes with a 10-5 name.
struct Named {
  std::vector<Eigen::Index> columns;
  Eigen::Matrix3Xd directions, standard;
};

Named named_electrodes(const Labels& labels, const Eigen::Matrix3Xd& from_centre) {
  Named named;
  std::vector<Eigen::Vector3d> standard;
  for (std::size_t i = 0; i < labels.size(); ++i) {
    const auto direction = standard_direction(labels[i]);
    const auto column = static_cast<Eigen::Index>(i);
    if (!direction || !(from_centre.col(column).norm() > 0)) continue;
    named.columns.push_back(column);
    standard.push_back(*direction);
  }
  named.directions = from_centre(Eigen::all, named.columns).colwise().normalized();
  named.standard.resize(3, named.directions.cols());
  for (std::size_t i = 0; i < standard.size(); ++i)
    named.standard.col(static_cast<Eigen::Index>(i)) = standard[i];
  return named;
}

/// Front and right as landmarks or axes tell them, in the cap's frame.
struct Marks {
  Eigen::Vector3d front, right;
  Eigen::Matrix3d rotation;
  bool upside_down = false;  ///< the electrodes lie below the plane of the landmarks
};

std::optional<Marks> landmark_marks(const DigitisedCap& cap, const SphereFit& sphere,
                                    Labels& notes) {
  if (!cap.nasion || !cap.left_ear || !cap.right_ear) return std::nullopt;
  const Eigen::Vector3d ears = *cap.right_ear - *cap.left_ear;
  const Eigen::Vector3d middle = (*cap.right_ear + *cap.left_ear) / 2;
  const double nasion_off =
      ears.normalized().cross(*cap.nasion - middle).norm();  // from the line through the ears
  if (!(ears.norm() > 0.8 * sphere.radius) || !(nasion_off > 0.4 * sphere.radius)) {
    notes.push_back(fmt::format(
        "landmarks left out: LPA and RPA {:.0f} mm apart, the nasion {:.0f} mm from "
        "the line through them, on a head of radius {:.0f} mm",
        ears.norm() / kMillimetre, nasion_off / kMillimetre, sphere.radius / kMillimetre));
    return std::nullopt;
  }
  Marks marks{*cap.nasion - middle, ears, rotation_by_landmarks(*cap.nasion - sphere.centre, ears)};
  const Eigen::Vector3d above = ears.cross(marks.front);
  marks.upside_down = above.dot(cap.electrodes.positions.rowwise().mean() - middle) < 0;
  return marks;
}

std::optional<Marks> axes_marks(const DigitisedCap& cap) {
  const auto to_ras = stated_axes(cap.axes);
  if (!to_ras) return std::nullopt;
  return Marks{to_ras->row(1), to_ras->row(0), *to_ras};
}

/// Which exchange happened, see the top; `q` takes the cap to the names' coordinates.
void tell_exchange(const Eigen::Matrix3d& q, const std::optional<Marks>& marks, CapFit& fit) {
  const bool improper = q.determinant() < 0;
  bool crossed = false;
  if (marks) {
    const Eigen::Vector3d front = q * marks->front, right = q * marks->right;
    const double azimuth = std::atan2(std::abs(front.x()), front.y()) * 180 / kPi;
    fit.reversed = azimuth > kReversedDeg;
    crossed = std::atan2(std::abs(right.y()), right.x()) * 180 / kPi > kReversedDeg;
  }
  fit.mirrored = fit.reversed ? improper && crossed : improper || crossed;
}

void note_exchange(double straight_deg, double mirrored_deg, const char* witness, CapFit& fit) {
  const std::string figures = fmt::format(
      "mean angle to the standard cap {:.1f} degrees as it stands, {:.1f} mirrored; "
      "front and right told by {}",
      straight_deg, mirrored_deg, witness);
  if (fit.mirrored)
    fit.notes.push_back("left and right seem exchanged, in the names, the landmarks or the axes: " +
                        figures);
  if (fit.reversed)
    fit.notes.push_back("front and back (nasion and inion) seem exchanged: " + figures);
}

/// The mirror that leads from the head frame to the names' coordinates: 1, 1, 1 but for an
/// exchange.
Eigen::Vector3d rotate_by_names(const Named& named, const std::optional<Marks>& landmarks,
                                const std::optional<Marks>& axes, CapFit& fit) {
  fit.method = "names";
  const NamesRotation straight = rotation_by_names(named.directions, named.standard, 1);
  const NamesRotation mirrored = rotation_by_names(named.directions, named.standard, -1);
  const bool improper = straight.mean_angle_deg > kMirrorLeastDeg &&
                        mirrored.mean_angle_deg < kMirrorGain * straight.mean_angle_deg;
  const Eigen::Matrix3d q = improper ? mirrored.rotation : straight.rotation;
  tell_exchange(q, landmarks ? landmarks : axes, fit);
  note_exchange(straight.mean_angle_deg, mirrored.mean_angle_deg,
                landmarks ? "the landmarks"
                : axes    ? "the stated axes"
                          : "the names alone",
                fit);
  Eigen::Vector3d mirror(1, 1, 1);
  if (improper) mirror = fit.mirrored ? Eigen::Vector3d(-1, 1, 1) : Eigen::Vector3d(1, -1, 1);
  fit.rotation = mirror.asDiagonal() * q;
  if (!landmarks) return mirror;
  fit.landmark_angle_deg = angle_between_deg(fit.rotation, landmarks->rotation);
  if (fit.landmark_angle_deg > kDisagreeDeg)
    fit.notes.push_back(fmt::format(
        "names and landmarks disagree by a rotation of {:.0f} degrees: the names are used",
        fit.landmark_angle_deg));
  return mirror;
}

void rotate_by_marks(const DigitisedCap& cap, const std::optional<Marks>& landmarks,
                     const std::optional<Marks>& axes, Eigen::Index names, CapFit& fit) {
  if (landmarks) {
    fit.method = "landmarks";
    fit.rotation = landmarks->rotation;
    fit.mirrored = landmarks->upside_down;
    if (fit.mirrored)
      fit.notes.push_back(
          "the electrodes lie below the plane of the landmarks: LPA and RPA are exchanged, or the "
          "nasion stands at the back, or the axes are mirrored");
    return;
  }
  if (axes && axes->rotation.determinant() > 0) {
    fit.method = "stated axes";
    fit.rotation = axes->rotation;
    fit.notes.push_back("turned by the stated axes " + cap.axes +
                        " alone: how far the cap is pitched cannot be told");
    return;
  }
  std::string message = fmt::format(
      "{}: the electrodes cannot be turned into the head frame: {} have a 10-5 name (at least {} "
      "are needed), nasion, LPA and RPA are not all there, and no right-handed axes (such as RAS) "
      "are stated. Give the landmarks, or positions in the head frame.",
      cap.source, names, kEnoughNames);
  for (const std::string& note : fit.notes) message += "\n  - " + note;
  throw InputError(message);
}

/// Angles to the standard cap, and electrodes that are far from where they belong; `mirror` takes
/// out an exchange, which would make an outlier of nearly every electrode.
void measure(const Named& named, const RobustSphere& sphere, const Eigen::Vector3d& mirror,
             CapFit& fit) {
  const auto count = static_cast<Eigen::Index>(fit.montage.labels.size());
  Eigen::VectorXd apart = Eigen::VectorXd::Constant(count, kNaN);
  if (named.directions.cols() > 0) {
    const Eigen::Matrix3Xd turned = fit.rotation * named.directions;
    const Eigen::VectorXd angles = angles_deg(turned, named.standard);
    fit.angle_rms_deg = std::sqrt(angles.squaredNorm() / static_cast<double>(angles.size()));
    apart(named.columns) = angles_deg(mirror.asDiagonal() * turned, named.standard);
  }
  for (Eigen::Index i = 0; i < count; ++i) {
    const auto index = static_cast<std::size_t>(i);
    if (!sphere.inside[index] || apart[i] > kMisplacedDeg)
      fit.outliers.push_back({fit.montage.labels[index], apart[i], sphere.fit.residual[i]});
  }
}

}  // namespace

CapFit fit_cap(const DigitisedCap& cap) {
  const Eigen::Matrix3Xd& positions = cap.electrodes.positions;
  if (positions.cols() < 4)
    throw InputError(fmt::format("{}: {} electrodes with a position, at least 4 are needed.",
                                 cap.source, positions.cols()));
  const RobustSphere sphere = fit_head(positions, cap.source);
  CapFit fit;
  fit.sphere = sphere.fit;
  if (!is_head_radius(fit.sphere.radius))
    throw InputError(fmt::format(
        "{}: the electrodes lie on a sphere of radius {:.4g} mm, expected 60 to 140 mm.",
        cap.source, fit.sphere.radius / kMillimetre));
  fit.notes = cap.notes;
  fit.angle_rms_deg = fit.landmark_angle_deg = kNaN;
  const Eigen::Matrix3Xd from_centre = positions.colwise() - fit.sphere.centre;
  const Named named = named_electrodes(cap.electrodes.labels, from_centre);
  const auto landmarks = landmark_marks(cap, fit.sphere, fit.notes);
  const auto axes = axes_marks(cap);
  Eigen::Vector3d mirror(1, 1, 1);
  if (named.directions.cols() >= kEnoughNames)
    mirror = rotate_by_names(named, landmarks, axes, fit);
  else
    rotate_by_marks(cap, landmarks, axes, named.directions.cols(), fit);
  fit.montage = {cap.electrodes.labels, fit.rotation * from_centre};
  measure(named, sphere, mirror, fit);
  return fit;
}

}  // namespace headwater
