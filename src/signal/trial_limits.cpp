// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/trial_limits.hpp"

#include <algorithm>
#include <cmath>

namespace headwater {
namespace {

using Index = Eigen::Index;

double largest_step(const Eigen::RowVectorXd& course) {
  const Index count = course.size();
  return count < 2 ? 0 : (course.tail(count - 1) - course.head(count - 1)).cwiseAbs().maxCoeff();
}

double peak_to_peak(const Eigen::RowVectorXd& course) {
  return course.maxCoeff() - course.minCoeff();
}

/// Median over leads at each sample (of an even number the upper of the two in the middle).
Eigen::RowVectorXd median_over_leads(const Eigen::MatrixXd& trial) {
  Eigen::RowVectorXd result(trial.cols());
  Eigen::VectorXd values(trial.rows());
  for (Index t = 0; t < trial.cols(); ++t) {
    values = trial.col(t);
    const auto middle = values.begin() + values.size() / 2;
    std::nth_element(values.begin(), middle, values.end());
    result(t) = *middle;
  }
  return result;
}

}  // namespace

Eigen::Array<bool, Eigen::Dynamic, Eigen::Dynamic> mark_limits(const Eigen::MatrixXd& data_V,
                                                               Index samples,
                                                               const std::vector<bool>& restored,
                                                               const TrialOptions& options) {
  if (options.reject_V <= 0 && options.flat_V <= 0 && options.step_V <= 0) return {};
  const Index trials = data_V.cols() / samples;
  Eigen::Array<bool, Eigen::Dynamic, Eigen::Dynamic> marked(trials, data_V.rows());
  for (Index k = 0; k < trials; ++k) {
    const Eigen::MatrixXd trial = data_V.middleCols(k * samples, samples);
    Eigen::RowVectorXd common;
    if (options.reject_V > 0) common = median_over_leads(trial);
    for (Index lead = 0; lead < data_V.rows(); ++lead) {
      const Eigen::RowVectorXd course = trial.row(lead);
      bool breaks =
          options.reject_V > 0 && (course - common).cwiseAbs().maxCoeff() > options.reject_V;
      if (!restored[static_cast<std::size_t>(lead)]) {
        breaks |= options.flat_V > 0 && peak_to_peak(course) < options.flat_V;
        breaks |= options.step_V > 0 && largest_step(course) > options.step_V;
      }
      marked(k, lead) = breaks;
    }
  }
  return marked;
}

BrokenLimit broken_limit(const Eigen::Ref<const Eigen::MatrixXd>& trial,
                         const std::vector<Index>& leads, const std::vector<bool>& restored,
                         const TrialOptions& options) {
  BrokenLimit amplitude{"amplitude", -1, options.reject_V}, flat{"flat", -1, options.flat_V},
      step{"step", -1, options.step_V};
  Eigen::RowVectorXd mean = Eigen::RowVectorXd::Zero(trial.cols());
  if (options.reject_V > 0) {
    for (const Index lead : leads) mean += trial.row(lead);
    mean /= static_cast<double>(leads.size());
  }
  for (const Index lead : leads) {
    const Eigen::RowVectorXd course = trial.row(lead);
    if (options.reject_V > 0) {
      const double largest = (course - mean).cwiseAbs().maxCoeff();
      if (largest > amplitude.figure) amplitude = {"amplitude", lead, largest};
    }
    if (restored[static_cast<std::size_t>(lead)]) continue;
    if (options.flat_V > 0 && peak_to_peak(course) < flat.figure)
      flat = {"flat", lead, peak_to_peak(course)};
    if (options.step_V > 0 && largest_step(course) > step.figure)
      step = {"step", lead, largest_step(course)};
  }
  for (const BrokenLimit& broken : {amplitude, flat, step})
    if (broken.lead >= 0) return broken;
  return {};
}

}  // namespace headwater
