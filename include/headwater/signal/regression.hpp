// SPDX-License-Identifier: GPL-3.0-or-later
// Regression of single trials on regressors, sample by sample (Smith & Kutas 2015 Psychophysiology
// 52:157): Y = X beta + E, least squares, with X = [one indicator column for each condition | the
// regressors, each centred over the trials used (or, with within_conditions, over those of its
// condition) and divided by its standard deviation over them]. beta of a regressor: V per standard
// deviation, all other columns held fixed. Its noise: C_trial [(X'X)^-1]_jj, so that its effective
// number of trials is 1 / [(X'X)^-1]_jj.
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
  Labels conditions;              ///< trials of these; empty: all
  bool within_conditions = true;  ///< centre within each condition
};

struct RegressionResult {
  Labels names;                         ///< of the regressors
  std::vector<Eigen::MatrixXd> beta_V;  ///< of each: #channels by #times, average reference
  std::vector<Eigen::MatrixXd> standard_error_V;  ///< same shape, from the residuals
  Eigen::VectorXd effective_trials;               ///< 1 / [(X'X)^-1]_jj
  Eigen::VectorXd inflation;                      ///< variance inflation factor of each, >= 1
  Eigen::VectorXd mean, deviation;                ///< over the trials used, before centring
  Eigen::Index trials = 0, degrees = 0;           ///< used; residual degrees of freedom
  Labels notes;                                   ///< trials without value; inflation above 5
  /// beta with a block of trials left out: of each block, of each regressor.
  std::vector<std::vector<Eigen::MatrixXd>> without_block;
};

/// blocks: 0: none; else consecutive blocks of nearly equal numbers of trials, each left out once
/// (from the block's own X'X and X'Y, not refitted from the trials). Errors (InputError): a
/// constant regressor, regressors that are linear combinations of one another (the last pivot below
/// 1e-10), fewer trials than columns + 10 (says both).
RegressionResult regress(const Trials& trials, const std::vector<Regressor>& regressors,
                         const RegressionOptions& options, int blocks);

/// A regressor's coefficients as a contrast like any other.
ContrastWaveform coefficient_contrast(const std::string& name, const RegressionResult& result,
                                      std::size_t regressor, const Trials& trials,
                                      const NoiseCovariance& noise);

}  // namespace headwater
