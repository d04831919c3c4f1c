// SPDX-License-Identifier: GPL-3.0-or-later
// Regression of single trials on regressors, sample by sample (Smith & Kutas 2015 Psychophysiology
// 52:157): Y = X beta + E, least squares, with X = [one indicator column for each condition | the
// regressors, each centred over the trials of its condition and divided by the standard deviation
// of what this leaves (divisor: trials less the means taken)]. Without within_conditions the trials
// are one group: one constant column, regressors centred over all, so that differences between
// conditions count as theirs. beta of a regressor: V per standard deviation, all other columns held
// fixed. Its noise: C_trial [(X'X)^-1]_jj, so that its effective number of trials is 1 /
// [(X'X)^-1]_jj. Inflation 1/(1-R^2), R^2 of the regressor on the others.
#pragma once
#include <headwater/signal/contrast.hpp>
#include <headwater/signal/trials.hpp>

#include <Eigen/Core>

#include <string>
#include <vector>

namespace headwater {

/// One regressor: a value for each row of the events (NaN: none, such trials are not used).
struct Regressor {
  std::string name;
  Eigen::VectorXd of_event;
};

struct RegressionOptions {
  Labels conditions;              ///< trials of these; empty: all. Those without a trial: no column
  bool within_conditions = true;  ///< centre within each condition
};

struct RegressionResult {
  Labels names;                         ///< of the regressors
  std::vector<Eigen::MatrixXd> beta_V;  ///< of each: #channels by #times, average reference
  std::vector<Eigen::MatrixXd> standard_error_V;  ///< same shape, from the residuals
  Eigen::VectorXd effective_trials;               ///< 1 / [(X'X)^-1]_jj
  Eigen::VectorXd inflation;                      ///< variance inflation factor of each, >= 1
  Eigen::VectorXd mean;                           ///< of each regressor over the trials used
  Eigen::VectorXd deviation;                      ///< what it was divided by, in its own unit
  Eigen::Index trials = 0, degrees = 0;           ///< used; residual degrees of freedom
  Labels notes;                                   ///< trials without value; inflation above 5
  /// beta with a block of trials left out: of each block, of each regressor; per standard deviation
  /// over all trials, so that blocks compare.
  std::vector<std::vector<Eigen::MatrixXd>> without_block;
};

/// blocks: 0: none; else consecutive blocks of nearly equal numbers of trials, each left out once
/// (from the block's own X'X and X'Y, not refitted from the trials). Errors (InputError): a
/// constant regressor, regressors that are linear combinations of one another (a pivot below 1e-10
/// of the matrix of their correlations: inflation above 1e10), the same where a block is left out,
/// fewer trials than columns + 10 (says both), unknown conditions, an infinite value.
/// ExperimentError: no regressor; blocks below 0, 1, or more than trials.
RegressionResult regress(const Trials& trials, const std::vector<Regressor>& regressors,
                         const RegressionOptions& options, int blocks);

/// A regressor's coefficients as a contrast like any other.
ContrastWaveform coefficient_contrast(const std::string& name, const RegressionResult& result,
                                      std::size_t regressor, const Trials& trials,
                                      const NoiseCovariance& noise);

}  // namespace headwater
