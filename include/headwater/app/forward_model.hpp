// SPDX-License-Identifier: GPL-3.0-or-later
// What the sources of one cap can look like at its electrodes: montage, head, source grid, regions
// and lead field. Participants with the same channels and positions share one.
#pragma once
#include <headwater/app/experiment_file.hpp>
#include <headwater/signal/cap_fit.hpp>

#include <Eigen/Core>

#include <map>
#include <memory>
#include <mutex>
#include <optional>
#include <string>
#include <vector>

namespace headwater {

/// Where the electrodes of one participant are.
struct ParticipantCap {
  std::string source;         ///< file, or "standard positions"
  Montage table;              ///< all positions of the table, head frame; empty: standard
  SphereFit sphere;           ///< radius 0 for standard positions
  std::optional<CapFit> fit;  ///< of a digitised cap
  Labels notes;               ///< unit mended, outlying electrodes, ...
};

/// Reads the participant's table and fits a digitised cap. Throws InputError: what the tables'
/// rooms throw, a table about another origin than the frame it claims, a cap with left and right or
/// nasion and inion exchanged.
ParticipantCap read_participant_cap(const Experiment& experiment, const std::string& participant);

/// Positions of these channels.
Montage montage_of(const Experiment& experiment, const ParticipantCap& cap, const Labels& channels);

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
  std::shared_ptr<const ForwardModel> of(const Montage& montage, const SphereFit& sphere);

 private:
  const Experiment* experiment_;
  std::mutex mutex_;
  std::vector<std::shared_ptr<const ForwardModel>> built_;
};

}  // namespace headwater
