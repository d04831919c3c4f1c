// SPDX-License-Identifier: GPL-3.0-or-later
// Divergence of two Normal-Inverse-Gamma beliefs, after (1) from before (0). The density factors as
// N(mu | m, s/k) IG(s | a, b), s the variance, so that by the chain rule
//   KL = KL(IG_1 || IG_0) + E_1 KL(N(m1, s/k1) || N(m0, s/k0))
//   KL(IG_1 || IG_0) = (a1 - a0) psi(a1) - ln G(a1) + ln G(a0) + a0 ln(b1/b0) + a1 (b0/b1 - 1)
//   E_1 KL(N || N)   = [ln(k1/k0) + k0/k1 - 1 + k0 (m1 - m0)^2 a1/b1] / 2,   as E_1[1/s] = a1/b1
// (Kullback & Leibler 1951 Ann Math Stat 22:79 for the definition; both parts are textbook
// integrals, and the tests integrate them).
#include "problems.hpp"

#include <headwater/base/distributions.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/regressors.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <cmath>
#include <limits>

namespace headwater {
namespace {

constexpr double kNaN = std::numeric_limits<double>::quiet_NaN();

double square(double x) {
  return x * x;
}

void check_options(const ObserverOptions& options) {
  std::vector<std::string> problems;
  const auto expect = [&](bool fits, const char* what, double found, const char* expected) {
    if (!fits) problems.push_back(fmt::format("{} is {}, expected {}.", what, found, expected));
  };
  const auto positive = [](double x) { return x > 0 && std::isfinite(x); };
  expect(options.forgetting > 0 && options.forgetting <= 1, "forgetting", options.forgetting,
         "above 0 and at most 1 (1: nothing is forgotten)");
  if (options.prior_mean)
    expect(std::isfinite(*options.prior_mean), "the prior mean", *options.prior_mean, "a number");
  if (options.prior_sd)
    expect(positive(*options.prior_sd), "the prior standard deviation", *options.prior_sd,
           "above 0");
  expect(positive(options.prior_weight), "the prior weight", options.prior_weight, "above 0");
  expect(positive(options.prior_shape), "the prior shape", options.prior_shape, "above 0");
  if (!problems.empty()) throw ExperimentError(problem_list("Regressors of a sequence", problems));
}

/// Places of the block columns in the events; the value column is checked with them.
std::vector<std::size_t> block_places(const Table& events, const ObserverOptions& options) {
  std::vector<std::size_t> places;
  Labels wanted{options.value_column}, missing;
  wanted.insert(wanted.end(), options.block_columns.begin(), options.block_columns.end());
  for (const std::string& name : wanted) {
    if (const auto place = events.find_column(name))
      places.push_back(*place);
    else
      missing.push_back(name + did_you_mean(name, events.columns));
  }
  if (!missing.empty())
    throw InputError(fmt::format("{}: no column {}; the columns are {}.", events.source,
                                 join_labels(missing), join_labels(events.columns)));
  places.erase(places.begin());
  return places;
}

/// The value of each row, NaN for n/a.
std::vector<double> sequence(const Table& events, const ObserverOptions& options) {
  const std::size_t column = events.column(options.value_column);
  std::vector<double> values;
  for (std::size_t row = 0; row < events.rows.size(); ++row) {
    double value = events.optional_number(row, column).value_or(kNaN);
    if (options.logarithm && value <= 0)
      throw InputError(fmt::format(
          "{}, line {}, column '{}': found {}, expected a value above 0: the logarithm is asked "
          "for. Correct it, write n/a, or take the values themselves.",
          events.source, events.lines[row], options.value_column, events.rows[row][column]));
    values.push_back(options.logarithm ? std::log(value) : value);
  }
  return values;
}

NormalBelief prior_of(const std::vector<double>& values, const ObserverOptions& options,
                      const std::string& where) {
  std::vector<double> known;
  std::copy_if(values.begin(), values.end(), std::back_inserter(known),
               [](double value) { return !std::isnan(value); });
  if (known.empty())
    throw InputError(where + ": no row has a value, expected a number in some of them.");
  const Eigen::Map<const Eigen::VectorXd> all(known.data(),
                                              static_cast<Eigen::Index>(known.size()));
  const double mean = all.mean();
  double deviation = options.prior_sd.value_or(0);
  if (!options.prior_sd) {
    // Rounding leaves equal values a spread of their own: they are compared with one another.
    if (all.minCoeff() == all.maxCoeff())
      throw InputError(fmt::format(
          "{}: every value is {:.6g}: there is no spread to take the prior's from, and nothing "
          "to be surprised at. Choose another column, or give the prior's standard deviation.",
          where, known.front()));
    deviation =
        std::sqrt((all.array() - mean).square().sum() / static_cast<double>(all.size() - 1));
  }
  return {options.prior_mean.value_or(mean), options.prior_weight, options.prior_shape,
          options.prior_shape * deviation * deviation};
}

}  // namespace

Prediction predict(const NormalBelief& belief) {
  return {belief.mean,
          std::sqrt(belief.scale * (belief.weight + 1) / (belief.shape * belief.weight)),
          2 * belief.shape};
}

double log_density(const Prediction& prediction, double value) {
  const double nu = prediction.degrees, z = (value - prediction.mean) / prediction.scale;
  return std::lgamma((nu + 1) / 2) - std::lgamma(nu / 2) - 0.5 * std::log(nu * kPi) -
         std::log(prediction.scale) - (nu + 1) / 2 * std::log1p(z * z / nu);
}

NormalBelief decay(const NormalBelief& belief, const NormalBelief& prior, double forgetting) {
  const double f = forgetting;
  NormalBelief result;
  result.weight = f * belief.weight + (1 - f) * prior.weight;
  result.mean =
      (f * belief.weight * belief.mean + (1 - f) * prior.weight * prior.mean) / result.weight;
  result.shape = f * belief.shape + (1 - f) * prior.shape;
  result.scale = f * belief.scale + (1 - f) * prior.scale;
  return result;
}

NormalBelief update(const NormalBelief& belief, double value) {
  const double error = value - belief.mean, weight = belief.weight + 1;
  return {belief.mean + error / weight, weight, belief.shape + 0.5,
          belief.scale + belief.weight * error * error / (2 * weight)};
}

double divergence(const NormalBelief& after, const NormalBelief& before) {
  const double variance = (after.shape - before.shape) * digamma(after.shape) -
                          std::lgamma(after.shape) + std::lgamma(before.shape) +
                          before.shape * std::log(after.scale / before.scale) +
                          after.shape * (before.scale / after.scale - 1);
  const double mean =
      0.5 * (std::log(after.weight / before.weight) + before.weight / after.weight - 1 +
             before.weight * square(after.mean - before.mean) * after.shape / after.scale);
  return variance + mean;
}

ObserverRegressors observe(const Table& events, const ObserverOptions& options) {
  check_options(options);
  const std::vector<std::size_t> blocks = block_places(events, options);
  const std::vector<double> values = sequence(events, options);
  ObserverRegressors result;
  result.prior = prior_of(values, options,
                          fmt::format("{}, column '{}'", events.source, options.value_column));
  const Eigen::VectorXd none =
      Eigen::VectorXd::Constant(static_cast<Eigen::Index>(values.size()), kNaN);
  result.surprise = result.prediction_error = result.absolute_error = result.weighted_error =
      result.belief_update = none;
  NormalBelief belief = result.prior;
  const std::vector<std::string>* last = nullptr;  // the last row with a value
  for (std::size_t row = 0; row < values.size(); ++row) {
    if (std::isnan(values[row])) continue;
    const auto& cells = events.rows[row];
    if (last && std::any_of(blocks.begin(), blocks.end(),
                            [&](std::size_t place) { return cells[place] != (*last)[place]; }))
      belief = result.prior;
    last = &cells;
    belief = decay(belief, result.prior, options.forgetting);
    const Prediction prediction = predict(belief);
    const NormalBelief after = update(belief, values[row]);
    const auto i = static_cast<Eigen::Index>(row);
    result.surprise[i] = -log_density(prediction, values[row]) / std::log(2.0);
    result.prediction_error[i] = values[row] - prediction.mean;
    result.absolute_error[i] = std::abs(result.prediction_error[i]);
    result.weighted_error[i] = result.absolute_error[i] / prediction.scale;
    result.belief_update[i] = divergence(after, belief);
    belief = after;
  }
  return result;
}

const Labels& observer_regressor_names() {
  static const Labels names{"surprise", "prediction_error", "absolute_error", "weighted_error",
                            "belief_update"};
  return names;
}

const Eigen::VectorXd& regressor(const ObserverRegressors& regressors, const std::string& name) {
  const Eigen::VectorXd* const all[] = {&regressors.surprise, &regressors.prediction_error,
                                        &regressors.absolute_error, &regressors.weighted_error,
                                        &regressors.belief_update};
  const auto place = find_label(observer_regressor_names(), name);
  if (!place)
    throw ExperimentError(fmt::format("There is no regressor '{}', but {}.{}", name,
                                      join_labels(observer_regressor_names()),
                                      did_you_mean(name, observer_regressor_names())));
  return *all[*place];
}

}  // namespace headwater
