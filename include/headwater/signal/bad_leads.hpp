// SPDX-License-Identifier: GPL-3.0-or-later
// Bad leads by robust statistics over trials (or averages), each lead judged by figures that anyone
// can recompute:
//   deviation    robust z, over leads, of log(median over trials of the trial's robust spread
//                1.4826 MAD), average reference: flat leads low, noisy leads high
//   correlation  median over trials of the largest correlation with a neighbouring lead
//   spline error median over trials of rms(lead - prediction) / rms(prediction), the prediction by
//                the spherical spline through all other leads; and its robust z of the logarithm
//                over leads
//   marked       share of trials in which the lead breaks a limit (amplitude, flatness, step)
// A lead is bad when |deviation z| > limit, or correlation < limit, or spline z > limit and spline
// error > 1, or marked > limit. The worst lead is taken out first and the figures of the others are
// made anew (a bad lead spoils the average reference and its neighbours' predictions), until none
// is left or a quarter of the leads is bad (then a note says that the recording is poor).
#pragma once
#include <headwater/signal/electrodes.hpp>

#include <Eigen/Core>

#include <map>
#include <string>
#include <vector>

namespace headwater {

struct BadLeadOptions {
  bool find = true;
  bool interpolate = false;        ///< false: bad leads are left out
  double deviation_limit = 5;      ///< robust z (common practice)
  double correlation_limit = 0.4;  ///< (common practice)
  double spline_limit = 5;         ///< robust z
  double marked_limit = 0.3;       ///< share of trials
  Labels bad, good;                ///< fixed by the user, whatever the figures say
};

struct LeadFigures {
  std::string channel;
  double deviation = 0, correlation = 0, spline_error = 0, spline_z = 0, marked = 0;
  bool bad = false;
  std::string reason;  ///< "spline error 7.1 (z 8.2)", "said so", ...; "" for a good lead
};

struct LeadCheck {
  std::vector<LeadFigures> leads;  ///< in the order of the channels
  std::string note;                ///< "" or that the recording is poor
  Labels bad() const;
};

/// data_V: M by (T * n), n trials side by side (any reference). marked: n by M, true where a lead
/// breaks a limit in a trial (empty: none). montage: M leads in the data's order.
LeadCheck check_leads(const Montage& montage, const Eigen::MatrixXd& data_V, Eigen::Index trials,
                      const Eigen::Array<bool, Eigen::Dynamic, Eigen::Dynamic>& marked,
                      const BadLeadOptions& options);

}  // namespace headwater
