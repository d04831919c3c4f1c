// SPDX-License-Identifier: GPL-3.0-or-later
// What the sources of one cap can look like at its electrodes: montage, head, source grid, regions
// and lead field. Participants with the same channels and positions share one.
#pragma once
#include <headwater/app/experiment_file.hpp>

#include <Eigen/Core>

#include <map>
#include <memory>
#include <mutex>
#include <string>
#include <vector>

namespace headwater {

struct ForwardModel {
  Montage montage;   ///< channels in the order of the data, head frame, m
  SphereFit sphere;  ///< through the positions of a table; radius 0 for standard positions
  HeadModel head;
  SourceGrid grid;
  PointLabels labels;
  std::vector<Region> lobes;    ///< lobes by side
  std::vector<Region> regions;  ///< as requested, or the lobes
  std::vector<std::vector<Eigen::Index>> neighbours;
  Eigen::Matrix3Xd outward;  ///< 3 by N, unit vectors from the head's centre
  Eigen::MatrixXd gain;      ///< M by 3N, V/(A m), zero mean over the sphere
};

/// Throws what montage, head, grid and region rooms throw.
std::shared_ptr<const ForwardModel> build_forward_model(const Experiment& experiment,
                                                        const Montage& montage,
                                                        const SphereFit& sphere);

/// Builds each distinct model once; safe to share between threads.
class ForwardModels {
 public:
  explicit ForwardModels(const Experiment& experiment) : experiment_(&experiment) {}
  /// Of a participant with these channels.
  std::shared_ptr<const ForwardModel> of(const std::string& participant, const Labels& channels);
  /// Of a montage that is at hand (the mean over participants).
  std::shared_ptr<const ForwardModel> of(const Montage& montage, const SphereFit& sphere);

 private:
  const Experiment* experiment_;
  std::mutex mutex_;
  std::vector<std::shared_ptr<const ForwardModel>> built_;
};

}  // namespace headwater
