// SPDX-License-Identifier: GPL-3.0-or-later
#include "app/influence.hpp"

#include "app/results_places.hpp"

#include <headwater/base/units.hpp>
#include <headwater/inverse/estimate.hpp>
#include <headwater/inverse/influence.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <cmath>
#include <limits>

namespace headwater {
namespace {

constexpr double kNone = std::numeric_limits<double>::quiet_NaN();

Eigen::Index largest_point(const Eigen::VectorXd& power) {
  Eigen::Index point = 0;
  power.maxCoeff(&point);
  return point;
}

/// Right half of a pair where the pair is preferred.
Eigen::Index answer_of(const DipoleVerdict& verdict) {
  return verdict.pair_preferred ? verdict.pair.point : verdict.one.point;
}

std::vector<double> values_of(const std::vector<PowerIndex>& indices) {
  std::vector<double> values;
  for (const auto& index : indices) values.push_back(index.value);
  return values;
}

/// Largest change of the two indices that sum up a map.
double index_change(const WindowInfluence& with_all, const LeftOut& without) {
  double change = 0;
  for (std::size_t k = 0; k < without.indices.size(); ++k) {
    const auto& index = with_all.indices[k];
    if (index.name == "laterality all" || index.name == "temporal-parietal both")
      change = std::max(change, std::abs(without.indices[k] - index.value));
  }
  return change;
}

/// The answer went to where its mirror image was: two sides nearly as large as one another, which
/// is no fault of what was left out.
bool changes_side(const ForwardModel& forward, const WindowInfluence& with_all,
                  const LeftOut& without) {
  constexpr double kNearImage = 30 * kMillimetre;
  Eigen::Vector3d image = forward.grid.mni_m.col(with_all.point);
  image.x() = -image.x();
  return without.shift_m > WindowInfluence::kLargeShift &&
         (forward.grid.mni_m.col(without.point) - image).norm() <= kNearImage;
}

bool matters(const ForwardModel& forward, const WindowInfluence& with_all, const LeftOut& without) {
  return (without.shift_m > WindowInfluence::kLargeShift &&
          !changes_side(forward, with_all, without)) ||
         index_change(with_all, without) > WindowInfluence::kLargeChange;
}

std::string sentence(const ForwardModel& forward, const WindowInfluence& with_all,
                     const LeftOut& without) {
  const auto at = forward.grid.mni_m.col(without.point);
  if (without.shift_m > WindowInfluence::kLargeShift)
    return fmt::format("without {} {} it moves {:.0f} mm, to ({:.0f}, {:.0f}, {:.0f}) {}",
                       without.kind == "participant" ? "participant" : without.kind, without.name,
                       without.shift_m / kMillimetre, at.x() / kMillimetre, at.y() / kMillimetre,
                       at.z() / kMillimetre, place_of(forward, without.point).lobe);
  return fmt::format("without {} {} an index changes by {:.2f}", without.kind, without.name,
                     index_change(with_all, without));
}

/// Fills in shifts, carriers and the note. Kinds are judged apart: a cap has many leads, a
/// recording few blocks.
void judge(const ForwardModel& forward, WindowInfluence& influence) {
  std::string unstable;
  int flips = 0;
  std::string flipped;
  for (const std::string kind : {"lead", "trials", "participant"}) {
    std::vector<const LeftOut*> movers;
    std::size_t all = 0;
    for (auto& entry : influence.left_out) {
      if (entry.kind != kind) continue;
      ++all;
      entry.shift_m =
          (forward.grid.mni_m.col(entry.point) - forward.grid.mni_m.col(influence.point)).norm();
      if (changes_side(forward, influence, entry)) {
        ++flips;
        flipped = kind + " " + entry.name;
      }
      if (matters(forward, influence, entry)) movers.push_back(&entry);
    }
    const bool few = movers.size() <= std::max<std::size_t>(1, all / 20);
    const LeftOut* worst = nullptr;
    for (const auto* mover : movers) {
      if (!few && !(mover->misfit > WindowInfluence::kLargeMisfit)) continue;
      influence.carriers.push_back(kind + " " + mover->name);
      if (!worst || mover->shift_m > worst->shift_m) worst = mover;
    }
    if (worst)
      influence.note += (influence.note.empty() ? "" : "; ") + sentence(forward, influence, *worst);
    else if (!movers.empty())
      unstable += fmt::format("{}{} of {} {}", unstable.empty() ? "" : ", ", movers.size(), all,
                              kind == "lead"          ? "leads"
                              : kind == "participant" ? "participants"
                                                      : "blocks of trials");
  }
  if (!unstable.empty())
    influence.note += fmt::format(
        "{}unstable: leaving out any one of {} moves it by more than {:.0f} mm or an index by more "
        "than {:g}",
        influence.note.empty() ? "" : "; ", unstable, WindowInfluence::kLargeShift / kMillimetre,
        WindowInfluence::kLargeChange);
  if (flips > 0)
    influence.note += fmt::format(
        "{}both sides are nearly as large: without {} the other is the larger",
        influence.note.empty() ? "" : "; ",
        flips == 1 ? flipped : fmt::format("any one of {} leads, blocks or participants", flips));
}

}  // namespace

WindowInfluence influence_on_map(const ForwardModel& forward, const SourceOperator& inverse,
                                 const Eigen::MatrixXd& window_V,
                                 const std::vector<PartLeftOut>& parts, std::size_t window) {
  const auto power_of = [&](const Eigen::MatrixXd& data) -> Eigen::VectorXd {
    return estimate_sources(inverse, data).amplitude.rowwise().squaredNorm();
  };
  WindowInfluence influence;
  const Eigen::VectorXd power = power_of(window_V);
  influence.point = largest_point(power);
  influence.indices = index_values(power, forward.lobes);
  const LeadDeletion deletion = delete_leads(inverse, window_V);
  const auto add = [&](const std::string& kind, const std::string& name,
                       const Eigen::VectorXd& remaining, double misfit) {
    influence.left_out.push_back({kind, name, largest_point(remaining), 0, misfit,
                                  values_of(index_values(remaining, forward.lobes))});
  };
  for (Eigen::Index m = 0; m < deletion.power.cols(); ++m)
    add("lead", forward.montage.labels[static_cast<std::size_t>(m)], deletion.power.col(m),
        deletion.misfit[m]);
  for (const auto& part : parts) add(part.kind, part.name, power_of(part.windows_V[window]), kNone);
  judge(forward, influence);
  return influence;
}

WindowInfluence influence_on_dipoles(const ForwardModel& forward, const DipoleScan& scan,
                                     const Eigen::MatrixXd& window_V,
                                     const std::vector<PartLeftOut>& parts, std::size_t window) {
  WindowInfluence influence;
  const Eigen::VectorXd map = window_V.rowwise().mean();
  influence.point = answer_of(scan.judge(map));
  const auto without_lead = scan.judge_without_leads(map);
  for (std::size_t m = 0; m < without_lead.size(); ++m)
    influence.left_out.push_back(
        {"lead", forward.montage.labels[m], answer_of(without_lead[m]), 0, kNone, {}});
  for (const auto& part : parts)
    influence.left_out.push_back({part.kind,
                                  part.name,
                                  answer_of(scan.judge(part.windows_V[window].rowwise().mean())),
                                  0,
                                  kNone,
                                  {}});
  judge(forward, influence);
  return influence;
}

}  // namespace headwater
