// SPDX-License-Identifier: GPL-3.0-or-later
// What an ideal observer expects of a sequence of values, and how much each value surprises it.
//
// Model: values are normal with unknown mean and variance; belief about them Normal-Inverse-Gamma
// (m, k, a, b), predictive for the next value x a Student t of 2a degrees of freedom about m with
// scale^2 b (k+1) / (a k). After x (textbook conjugate analysis, e.g. Murphy 2007):
//   m' = (k m + x)/(k+1), k' = k+1, a' = a+1/2, b' = b + k (x-m)^2 / (2 (k+1))
// Forgetting: before each value the belief decays towards the prior (m0, k0, a0, b0) with factor f:
// k <- f k + (1-f) k0, a and b alike, and k m <- f k m + (1-f) k0 m0, so that a constant world is
// remembered over about 1/(1-f) values. f = 1: nothing is forgotten.
// Regressors of the value x, from the belief before it:
//   surprise                  -log2 of the predictive density times the unit of the values, bit:
//                             values written in a unit c times smaller (s -> ms: c = 1000) add
//                             log2 c to every surprise and change nothing else of it. Of
//                             logarithms: the natural logarithm is the unit
//   prediction error          x - m, unit of the values; and its magnitude
//   weighted prediction error |x - m| / predictive scale: in multiples of what was expected
//   belief update             Kullback-Leibler divergence of the belief after x from the belief
//                             before it (decayed, without x): KL(after || before), nat
#pragma once
#include <headwater/base/labels.hpp>
#include <headwater/base/table.hpp>

#include <Eigen/Core>

#include <optional>
#include <string>
#include <vector>

namespace headwater {

/// Normal-Inverse-Gamma belief: mean m, weight k > 0, shape a > 0, scale b > 0.
struct NormalBelief {
  double mean = 0, weight = 1, shape = 1, scale = 1;
};

struct Prediction {
  double mean = 0, scale = 1, degrees = 2;  ///< Student t
};

Prediction predict(const NormalBelief& belief);
/// Natural logarithm of the Student-t density.
double log_density(const Prediction& prediction, double value);
NormalBelief decay(const NormalBelief& belief, const NormalBelief& prior, double forgetting);
NormalBelief update(const NormalBelief& belief, double value);
/// KL(after || before), nat, closed form.
double divergence(const NormalBelief& after, const NormalBelief& before);

struct ObserverOptions {
  std::string value_column;  ///< of the events: the value of each stimulus
  Labels block_columns;      ///< a change in any of them, from one value to the next, starts
                             ///< again from the prior
  double forgetting = 0.95;  ///< 0 < f <= 1
  std::optional<double> prior_mean;  ///< empty: mean over all values
  std::optional<double> prior_sd;    ///< sqrt(b/a); empty: standard deviation over all values (n-1)
  double prior_weight = 1;           ///< k0: the prior mean counts as so many values
  double prior_shape = 1;            ///< a0: the prior variance counts as 2 a0 values
  bool logarithm = false;            ///< natural, of the values first (durations, frequencies); the
                                     ///< prior's mean and sd are then of logarithms too
};

/// The regressors of each row of the events, NaN where the row's value is n/a (such a row changes
/// nothing). Rows in order of onset.
struct ObserverRegressors {
  Eigen::VectorXd surprise, prediction_error, absolute_error, weighted_error, belief_update;
  NormalBelief prior;  ///< as used
};

/// Throws InputError: unknown columns, no values, a value that is no number (line and column), a
/// logarithm of a value <= 0, equal values only (no spread and no prior_sd given). ExperimentError:
/// options outside their range, all of them at once.
ObserverRegressors observe(const Table& events, const ObserverOptions& options);

/// Names by which regressors are asked for: "surprise", "prediction_error", "absolute_error",
/// "weighted_error", "belief_update".
const Labels& observer_regressor_names();
/// Throws ExperimentError for another name.
const Eigen::VectorXd& regressor(const ObserverRegressors& regressors, const std::string& name);

}  // namespace headwater
