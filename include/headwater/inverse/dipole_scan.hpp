// SPDX-License-Identifier: GPL-3.0-or-later
// A second opinion beside the distributed maps: the one point, or the one mirrored pair of points,
// whose dipoles of free orientation explain a scalp map best.
//
// In the reference-free subspace, not whitened (a misfit of the head model outweighs the noise of
// an average): with Q_l an orthonormal basis of the columns of K_l (3) or [K_l K_mirror(l)] (6),
//   unexplained(l) = 1 - |Q_l'y|^2 / |y|^2.
// Two symmetric generators, each in its own hemisphere, are merged by every smooth inverse into one
// false maximum, deep and near the midline. Whether a pair earns its three more parameters is
// judged by the Bayesian information criterion (Schwarz 1978 Ann Stat 6:461), n ln(unexplained) + k
// ln(n), n = M-1, k = 6 (position, moment) for one point, 9 for a mirrored pair; a difference above
// 2 counts as evidence (Kass & Raftery 1995 J Am Stat Assoc 90:773). The weaker half must carry at
// least a third of the stronger one's moment (common practice; no source): a head model that
// misfits one lateral source is otherwise repaired by a small second one. Pairs closer than 40 mm
// are left out: their two halves cannot be told apart.
#pragma once
#include <headwater/inverse/subspace.hpp>
#include <headwater/model/source_grid.hpp>

#include <Eigen/Core>

#include <vector>

namespace headwater {

struct DipoleFit {
  Eigen::Index point = -1;    ///< -1: no candidate
  Eigen::Index partner = -1;  ///< the mirror image of a pair (its left half), -1 for one point
  double unexplained = 1;     ///< residual variance, 0 to 1
  double criterion = 0;       ///< BIC
  Eigen::Vector3d moment_Am = Eigen::Vector3d::Zero();
  Eigen::Vector3d partner_moment_Am = Eigen::Vector3d::Zero();
};

struct DipoleVerdict {
  DipoleFit one, pair;
  bool pair_preferred = false;  ///< lower criterion by more than 2, and balanced
};

/// Factorises every candidate once; then judges any number of scalp maps.
class DipoleScan {
 public:
  DipoleScan(const Subspace& subspace, const SourceGrid& grid);
  /// map_V: M channels, any reference.
  DipoleVerdict judge(const Eigen::VectorXd& map_V) const;
  /// The same with each lead left out in turn (an indicator of the lead joins every candidate's
  /// columns: exact, and cheap).
  std::vector<DipoleVerdict> judge_without_leads(const Eigen::VectorXd& map_V) const;

 private:
  /// One kind of candidate: single points (width 3) or pairs (width 6).
  struct Candidates {
    int width = 3;
    std::vector<Eigen::Index> points;  // single points; right halves of pairs
    Eigen::MatrixXd basis;             // Q_l side by side: M-1 by width * #points
  };
  /// The fit of candidate `place` to y; `without`: empty, or the lead's column to leave out.
  DipoleFit fit(const Candidates& candidates, Eigen::Index place, double unexplained,
                const Eigen::VectorXd& y, const Eigen::VectorXd& without) const;
  DipoleFit best(const Candidates& candidates, const Eigen::VectorXd& y) const;
  std::vector<DipoleFit> best_without_leads(const Candidates& candidates,
                                            const Eigen::VectorXd& y) const;

  const Subspace* subspace_;
  const SourceGrid* grid_;
  Candidates one_, pair_;
};

}  // namespace headwater
