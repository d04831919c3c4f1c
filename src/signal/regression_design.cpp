// SPDX-License-Identifier: GPL-3.0-or-later
// The indicator columns need no arithmetic: a coefficient beside them is that of the regressors
// centred within the groups that they indicate (Frisch & Waugh 1933 Econometrica 1:387).
#include "regression_design.hpp"

#include "problems.hpp"

#include <headwater/base/error.hpp>

#include <Eigen/QR>
#include <fmt/core.h>

#include <cmath>
#include <stdexcept>

namespace headwater {
namespace {

constexpr double kPivot = 1e-10, kConstant = 1e-12, kWorthANote = 5;
constexpr Eigen::Index kSpareTrials = 10;

/// Which of trials.conditions take part.
std::vector<bool> chosen_conditions(const Trials& trials, const Labels& wanted) {
  std::vector<bool> chosen(trials.conditions.size(), wanted.empty());
  for (const Eigen::Index place : match_labels(wanted, trials.conditions, "the trials' conditions"))
    chosen[static_cast<std::size_t>(place)] = true;
  return chosen;
}

double value_of(const Regressor& regressor, std::size_t event_row) {
  const auto row = static_cast<Eigen::Index>(event_row);
  if (row >= regressor.of_event.size())
    throw std::logic_error("regress: regressor '" + regressor.name +
                           "' has fewer values than there are events");
  const double value = regressor.of_event[row];
  if (std::isinf(value))
    throw InputError(fmt::format("Regressor '{}' is infinite in row {} of the events.",
                                 regressor.name, event_row + 1));
  return value;
}

/// Picks the trials of the chosen conditions in which every regressor has a value; returns their
/// values, n by R.
Eigen::MatrixXd choose_trials(Design& design, const Trials& trials,
                              const std::vector<Regressor>& regressors,
                              const RegressionOptions& options) {
  const std::vector<bool> chosen = chosen_conditions(trials, options.conditions);
  const auto columns = static_cast<Eigen::Index>(regressors.size());
  std::vector<Eigen::Index> without(regressors.size(), 0), groups(chosen.size(), -1);
  std::vector<double> sizes;
  Eigen::MatrixXd values(trials.count(), columns);
  Eigen::Index candidates = 0;
  for (std::size_t k = 0; k < trials.condition.size(); ++k) {
    const std::size_t condition = trials.condition[k];
    if (!chosen[condition]) continue;
    ++candidates;
    bool complete = true;
    for (std::size_t j = 0; j < regressors.size(); ++j) {
      const double value = value_of(regressors[j], trials.event_row[k]);
      values(design.count(), static_cast<Eigen::Index>(j)) = value;
      if (!std::isnan(value)) continue;
      complete = false;
      ++without[j];
    }
    if (!complete) continue;
    if (groups[condition] < 0) {
      groups[condition] =
          options.within_conditions ? static_cast<Eigen::Index>(sizes.size()) : Eigen::Index{0};
      if (options.within_conditions || sizes.empty()) sizes.push_back(0);
    }
    ++sizes[static_cast<std::size_t>(groups[condition])];
    design.group.push_back(groups[condition]);
    design.trials.push_back(static_cast<Eigen::Index>(k));
  }
  design.group_size =
      Eigen::Map<const Eigen::VectorXd>(sizes.data(), static_cast<Eigen::Index>(sizes.size()));
  for (std::size_t j = 0; j < regressors.size(); ++j)
    if (without[j] > 0)
      design.notes.push_back(
          fmt::format("{} of {} trials have no value of regressor '{}' and are "
                      "not used",
                      without[j], candidates, regressors[j].name));
  for (std::size_t c = 0; c < chosen.size(); ++c)
    if (chosen[c] && groups[c] < 0)
      design.notes.push_back(
          fmt::format("no trial of condition '{}' is used", trials.conditions[c]));
  values.conservativeResize(design.count(), columns);
  return values;
}

/// Takes each group's mean from each column.
void centre_in_groups(Eigen::MatrixXd& values, const Design& design) {
  Eigen::MatrixXd means = Eigen::MatrixXd::Zero(design.groups(), values.cols());
  for (Eigen::Index i = 0; i < values.rows(); ++i)
    means.row(design.group[static_cast<std::size_t>(i)]) += values.row(i);
  means.array().colwise() /= design.group_size.array();
  for (Eigen::Index i = 0; i < values.rows(); ++i)
    values.row(i) -= means.row(design.group[static_cast<std::size_t>(i)]);
}

/// Those that no slope can be had of: they do not vary, or not within conditions.
void refuse_constants(const Eigen::MatrixXd& values, const Eigen::MatrixXd& overall,
                      const Eigen::MatrixXd& within, const std::vector<Regressor>& regressors) {
  std::vector<std::string> problems;
  for (Eigen::Index j = 0; j < values.cols(); ++j) {
    const std::string& name = regressors[static_cast<std::size_t>(j)].name;
    const double size = values.col(j).cwiseAbs().maxCoeff();
    if (!(overall.col(j).cwiseAbs().maxCoeff() > kConstant * size))
      problems.push_back(fmt::format("regressor '{}' is constant: {:.6g} in each of {} trials.",
                                     name, values(0, j), values.rows()));
    else if (!(within.col(j).cwiseAbs().maxCoeff() > kConstant * size) ||
             within.col(j).squaredNorm() < kPivot * overall.col(j).squaredNorm())
      problems.push_back(fmt::format(
          "regressor '{}' is constant within each condition: it cannot be told from the "
          "conditions. Leave it out, or join the conditions.",
          name));
  }
  if (!problems.empty()) throw InputError(problem_list("Regression", problems));
}

/// Looks for columns that the others make up. Scaled to length 1, X'X is the matrix of correlations
/// and the squared diagonal of R its pivots.
void refuse_combinations(const Eigen::MatrixXd& within, const std::vector<Regressor>& regressors) {
  const Eigen::ColPivHouseholderQR<Eigen::MatrixXd> qr(within.colwise().normalized());
  Labels dependent, others;
  for (Eigen::Index k = 0; k < within.cols(); ++k) {
    const auto column = static_cast<std::size_t>(qr.colsPermutation().indices()[k]);
    const double pivot = qr.matrixR()(k, k);
    (pivot * pivot < kPivot ? dependent : others).push_back(regressors[column].name);
  }
  if (!dependent.empty())
    throw InputError(fmt::format(
        "Regression: {} can be made up from {} (linear combination, inflation above {:g}): their "
        "effects cannot be told apart. Leave {} out.",
        join_labels(dependent), join_labels(others), 1 / kPivot,
        dependent.size() == 1 ? "it" : "some"));
}

}  // namespace

Design make_design(const Trials& trials, const std::vector<Regressor>& regressors,
                   const RegressionOptions& options) {
  if (regressors.empty()) throw ExperimentError("Regression: no regressor is given.");
  Design design;
  const Eigen::MatrixXd values = choose_trials(design, trials, regressors, options);
  const Eigen::Index columns = design.groups() + values.cols();
  if (design.count() < columns + kSpareTrials)
    throw InputError(problem_list(
        fmt::format("Regression: {} trials for {} columns ({} conditions, {} regressors), at "
                    "least {} are needed",
                    design.count(), columns, design.groups(), values.cols(),
                    columns + kSpareTrials),
        design.notes.empty() ? Labels{"join conditions, or leave regressors out."} : design.notes));
  design.mean = values.colwise().mean();
  Eigen::MatrixXd overall = values.rowwise() - design.mean.transpose();
  Eigen::MatrixXd within = overall;  // from the centred values: less is lost to a large mean
  centre_in_groups(within, design);
  refuse_constants(values, overall, within, regressors);
  refuse_combinations(within, regressors);
  const auto degrees = static_cast<double>(design.count() - design.groups());
  design.deviation = within.colwise().norm() / std::sqrt(degrees);
  within.array().rowwise() /= design.deviation.transpose().array();
  const Eigen::HouseholderQR<Eigen::MatrixXd> qr(within);
  design.q = qr.householderQ() * Eigen::MatrixXd::Identity(within.rows(), within.cols());
  design.inverse = qr.matrixQR()
                       .topRows(within.cols())
                       .triangularView<Eigen::Upper>()
                       .solve(Eigen::MatrixXd::Identity(within.cols(), within.cols()));
  // [X'X]_jj [(X'X)^-1]_jj; the scaled regressor's sum of squares is the divisor's.
  design.inflation = degrees * design.variance();
  for (Eigen::Index j = 0; j < values.cols(); ++j)
    if (design.inflation[j] > kWorthANote)
      design.notes.push_back(
          fmt::format("regressor '{}' is largely made up of the others: variance inflation {:.1f}",
                      regressors[static_cast<std::size_t>(j)].name, design.inflation[j]));
  return design;
}

}  // namespace headwater
