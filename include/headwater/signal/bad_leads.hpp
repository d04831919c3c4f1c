// SPDX-License-Identifier: GPL-3.0-or-later
// Bad leads by robust statistics over trials (or averages), each lead judged by figures that anyone
// can recompute:
//   deviation    robust z, over leads, of log(median over trials of the trial's robust spread
//                1.4826 MAD), average reference: flat leads low, noisy leads high
//   correlation  median over trials of the largest correlation with a neighbouring lead
//   spline error median over trials of rms(lead - prediction) / rms(prediction), the prediction by
//                the spherical spline through all other leads; and its robust z of the logarithm
//                over leads
//   marked       share of trials in which the lead breaks a limit (amplitude, flatness, step) while
//                fewer than half of its neighbours do: blinks are no fault of the frontal leads
// A lead is bad when |deviation z| > limit, or correlation < limit, or spline z > limit and spline
// error > 1, or marked > limit. The worst lead is taken out first and the figures of the others are
// made anew (a bad lead spoils the average reference and its neighbours' predictions), until none
// is left or a quarter of the leads is bad (then a note says that the recording is poor). The worst
// passes a limit by the largest factor; of a correlation that is (1 - correlation) / (1 - limit).
//
// Each trial's mean over time is taken off every lead first: offsets between leads are no signal.
// Robust z: (value - median) / (1.4826 MAD), the latter at least 0.1, so that leads that are alike
// to 10 % are not told apart. Average reference and predictions are those of the leads not bad by
// then. In the end each lead that was taken out is looked at once more, as one of the good leads
// and itself: these are its figures, and if it is not bad by them (a bad neighbour was to blame,
// and is out) it comes back. A lead without neighbours has no correlation (NaN) and is not judged
// by it. At most 200 trials are looked at, evenly spread (marks: all). A pass costs 2 M^3
// operations for each of them. A lead without any signal looks, in the average reference, like one
// in which sources cancel: marks of flatness find it for certain, the figures mostly.
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
