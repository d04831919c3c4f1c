// SPDX-License-Identifier: GPL-3.0-or-later
// Channels, and where their electrodes are. Tables of positions: read_positions.cpp.
#include "problems.hpp"

#include <headwater/base/convex_hull.hpp>
#include <headwater/base/error.hpp>
#include <headwater/signal/electrodes.hpp>
#include <headwater/signal/standard_cap.hpp>

#include <fmt/core.h>

#include <algorithm>

namespace headwater {
namespace {

constexpr std::size_t kFewestChannels = 8;
constexpr double kLongestEdge = 1;  // chord of 60 degrees on the unit sphere: 2 sin 30

/// Exact spelling first, so that a file with both "x" and "X" can have one of them dropped.
std::optional<Eigen::Index> find_channel(const Labels& channels, const std::string& name) {
  const auto exact = find_label(channels, name);
  return exact ? exact : find_label_any_case(channels, name);
}

/// Notes what the edits make of each channel: a new name, or nothing for a dropped one.
std::vector<std::optional<std::string>> edited_names(const Labels& file_channels,
                                                     const ChannelEdits& edits,
                                                     std::vector<std::string>& problems) {
  std::vector<std::optional<std::string>> names(file_channels.begin(), file_channels.end());
  const auto missing = [&](const char* what, const std::string& name) {
    problems.push_back(
        fmt::format("no channel '{}' to {}.{}", name, what, did_you_mean(name, file_channels)));
  };
  for (const std::string& name : edits.drop) {
    if (const auto index = find_channel(file_channels, name))
      names[static_cast<std::size_t>(*index)].reset();
    else
      missing("drop", name);
  }
  for (const auto& [from, to] : edits.rename) {
    const auto index = find_channel(file_channels, from);
    if (!index)
      missing("rename", from);
    else if (auto& name = names[static_cast<std::size_t>(*index)])
      name = to;
    else
      problems.push_back(
          fmt::format("channel '{}' is both dropped and renamed to '{}': do one.", from, to));
  }
  return names;
}

}  // namespace

ChannelPlan plan_channels(const Labels& file_channels, const ChannelEdits& edits,
                          const std::string& where) {
  std::vector<std::string> problems;
  const auto names = edited_names(file_channels, edits, problems);
  ChannelPlan plan;
  for (std::size_t i = 0; i < names.size(); ++i) {
    if (!names[i]) continue;
    plan.labels.push_back(*names[i]);
    plan.source.push_back(static_cast<Eigen::Index>(i));
  }
  const Labels repeated = repeated_labels(plan.labels);
  if (!repeated.empty())
    problems.push_back(
        fmt::format("more than one channel is named {} after the edits (upper and "
                    "lower case alike): rename or drop one.",
                    join_labels(repeated)));
  for (const std::string& name : edits.zero) {
    if (find_label_any_case(plan.labels, name)) {
      problems.push_back(fmt::format(
          "'{}' is to be a channel of zeros (the recording reference) but is already a channel: "
          "drop the file's column first.",
          name));
      continue;
    }
    plan.labels.push_back(name);
    plan.source.push_back(-1);
  }
  if (plan.labels.size() < kFewestChannels)
    problems.push_back(fmt::format("{} channels left, at least {} are needed.", plan.labels.size(),
                                   kFewestChannels));
  if (!problems.empty()) throw InputError(problem_list(where, problems));
  return plan;
}

Montage standard_montage(const Labels& labels, double radius_m) {
  Montage montage;
  montage.labels = labels;
  montage.positions.resize(3, static_cast<Eigen::Index>(labels.size()));
  std::vector<std::string> problems;
  for (std::size_t i = 0; i < labels.size(); ++i) {
    if (const auto direction = standard_direction(labels[i]))
      montage.positions.col(static_cast<Eigen::Index>(i)) = radius_m * *direction;
    else
      problems.push_back(fmt::format("'{}' is not a name of the 10-5 system.{}", labels[i],
                                     did_you_mean(labels[i], standard_names())));
  }
  if (!problems.empty()) {
    problems.back() += "\nRename such channels, drop them, or give a table of positions.";
    throw InputError(problem_list("Standard electrode positions", problems));
  }
  return montage;
}

Montage select_positions(const Montage& table, const Labels& labels, const std::string& where) {
  Montage montage;
  montage.labels = labels;
  montage.positions.resize(3, static_cast<Eigen::Index>(labels.size()));
  Labels missing;
  for (std::size_t i = 0; i < labels.size(); ++i) {
    if (const auto index = find_label_any_case(table.labels, labels[i]))
      montage.positions.col(static_cast<Eigen::Index>(i)) = table.positions.col(*index);
    else
      missing.push_back(labels[i]);
  }
  if (!missing.empty())
    throw InputError(fmt::format(
        "{}: no position for {}. The table has {}. Rename or drop such channels, or add them to "
        "the table.",
        where, join_labels(missing), join_labels(table.labels)));
  return montage;
}

SphereFit fit_head_sphere(const Montage& montage) {
  return fit_sphere(montage.positions);
}

std::vector<std::vector<Eigen::Index>> channel_neighbours(const Montage& montage) {
  const Eigen::Matrix3Xd directions = montage.positions.colwise().normalized();
  return triangle_neighbours(convex_hull_triangles(directions), directions, kLongestEdge);
}

}  // namespace headwater
