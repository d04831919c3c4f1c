// SPDX-License-Identifier: GPL-3.0-or-later
// Residuals are kept scaled by sqrt(n_k), so that every column is noise of one trial and
//   S = sum over columns of r r' / divisor,   divisor = degrees of freedom.
#include "noise_parts.hpp"
#include "problems.hpp"

#include <headwater/base/error.hpp>
#include <headwater/base/table.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/noise_covariance.hpp>
#include <headwater/signal/reference.hpp>
#include <headwater/signal/trial_covariance.hpp>

#include <Eigen/Eigenvalues>
#include <fmt/core.h>

#include <algorithm>
#include <cmath>

namespace headwater {
namespace {

constexpr Eigen::Index kFewestSamples = 5;

/// Scaled residuals in the subspace, one (M-1) by T block for each condition.
struct Residuals {
  std::vector<Eigen::MatrixXd> blocks;
  Eigen::Index degrees = 0;
  std::string source;
};

/// First sample and number of samples between two times, both included.
std::pair<Eigen::Index, Eigen::Index> window(const Eigen::VectorXd& times_s, double from_s,
                                             double to_s, const std::string& what) {
  const Eigen::Index all = times_s.size();
  // Written times are rounded: a sample belongs to an end it misses by a thousandth of a step.
  const double slack =
      all > 1 ? 1e-3 * (times_s[all - 1] - times_s[0]) / static_cast<double>(all - 1) : 0;
  Eigen::Index first = 0, last = all;
  while (first < all && times_s[first] < from_s - slack) ++first;
  while (last > first && times_s[last - 1] > to_s + slack) --last;
  const Eigen::Index count = last - first;
  if (count < kFewestSamples)
    throw InputError(
        fmt::format("Noise covariance: {} in the {}, at least {} are needed (the averages run from "
                    "{} to {} s). "
                    "Widen it, take the residual after a late latency, or give a table.",
                    count == 0   ? std::string("no sample")
                    : count == 1 ? std::string("one sample")
                                 : fmt::format("{} samples", count),
                    what, kFewestSamples, all ? times_s[0] : 0.0, all ? times_s[all - 1] : 0.0));
  return {first, count};
}

Residuals baseline_residuals(const std::vector<Average>& averages, const NoiseOptions& options) {
  const Eigen::VectorXd& times = averages.front().times_s;
  double from = options.baseline_from_s, to = options.baseline_to_s;
  if (from == to) {
    // All samples before 0. A sample at 0 itself may be written as -1e-17.
    const double step = times.size() > 1 ? times[1] - times[0] : 0;
    from = times.size() ? times[0] : 0;
    to = -0.5 * step;
  }
  const std::string what = options.baseline_from_s == options.baseline_to_s
                               ? std::string("baseline (samples before 0 s)")
                               : fmt::format("baseline from {:.6g} to {:.6g} s", from, to);
  const auto [first, count] = window(times, from, to, what);
  const Eigen::MatrixXd basis = reference_free_basis(averages.front().data_V.rows());
  Residuals result;
  for (const Average& average : averages) {
    Eigen::MatrixXd block = basis.transpose() * average.data_V.middleCols(first, count);
    block.colwise() -= block.rowwise().mean().eval();
    result.blocks.push_back(std::sqrt(average.trials) * block);
  }
  result.degrees = static_cast<Eigen::Index>(averages.size()) * (count - 1);
  result.source =
      fmt::format("{} of {} averages, {} samples each, mean removed", what, averages.size(), count);
  return result;
}

/// Takes each row's least-squares straight line away.
void remove_lines(Eigen::MatrixXd& block) {
  const Eigen::Index samples = block.cols();
  Eigen::VectorXd slope = Eigen::VectorXd::LinSpaced(samples, -1, 1);
  slope /= slope.norm();
  block.colwise() -= block.rowwise().mean().eval();
  block -= (block * slope).eval() * slope.transpose();
}

Residuals late_residuals(const std::vector<Average>& averages, const NoiseOptions& options) {
  const Eigen::VectorXd& times = averages.front().times_s;
  const std::string what = fmt::format("residual after {:.6g} s", options.after_s);
  const auto [first, count] =
      window(times, options.after_s, times.size() ? times[times.size() - 1] : 0, what);
  const Eigen::MatrixXd basis = reference_free_basis(averages.front().data_V.rows());
  Residuals result;
  Eigen::MatrixXd shared = Eigen::MatrixXd::Zero(basis.cols(), count);
  double trials = 0;
  for (const Average& average : averages) {
    result.blocks.push_back(basis.transpose() * average.data_V.middleCols(first, count));
    shared += average.trials * result.blocks.back();
    trials += average.trials;
  }
  const bool several = averages.size() > 1;
  for (std::size_t k = 0; k < averages.size(); ++k) {
    Eigen::MatrixXd& block = result.blocks[k];
    if (several) block -= shared / trials;
    remove_lines(block);
    block *= std::sqrt(averages[k].trials);
  }
  const auto conditions = static_cast<Eigen::Index>(averages.size());
  result.degrees = (several ? conditions - 1 : 1) * (count - 2);
  result.source =
      fmt::format("{} of {} averages, {} samples each, {} removed", what, averages.size(), count,
                  several ? "what the conditions share and straight lines" : "straight lines");
  return result;
}

void check_averages(const std::vector<Average>& averages) {
  if (averages.empty()) throw InputError("Noise covariance: there is no average.");
  std::vector<std::string> problems;
  const Average& first = averages.front();
  for (const Average& average : averages) {
    if (!(average.trials > 0))
      problems.push_back(fmt::format("condition '{}' has {} trials, at least one is needed.",
                                     average.condition, average.trials));
    if (average.channels != first.channels || average.data_V.rows() != first.data_V.rows() ||
        average.data_V.cols() != first.data_V.cols())
      problems.push_back(fmt::format("condition '{}' has other channels or samples than '{}'.",
                                     average.condition, first.condition));
  }
  if (first.data_V.rows() < 2) problems.push_back("fewer than 2 channels.");
  if (!problems.empty()) throw InputError(problem_list("Noise covariance", problems));
}

/// The table's numbers, rows and columns in the order of `channels`.
Eigen::MatrixXd table_matrix(const Table& table, const Labels& channels) {
  const std::size_t name_column = table.column("name");
  Labels row_names, missing_rows, missing_columns;
  for (const auto& row : table.rows) row_names.push_back(row[name_column]);
  std::vector<std::size_t> rows, columns;
  for (const std::string& name : channels) {
    const auto row = find_label_any_case(row_names, name);
    const auto column = find_label_any_case(table.columns, name);
    if (row)
      rows.push_back(static_cast<std::size_t>(*row));
    else
      missing_rows.push_back(name);
    if (column)
      columns.push_back(static_cast<std::size_t>(*column));
    else
      missing_columns.push_back(name);
  }
  std::vector<std::string> problems;
  if (const Labels repeated = repeated_labels(row_names); !repeated.empty())
    problems.push_back("more than one row is named " + join_labels(repeated) + ".");
  if (!missing_rows.empty()) problems.push_back("no row for " + join_labels(missing_rows) + ".");
  if (!missing_columns.empty())
    problems.push_back("no column for " + join_labels(missing_columns) + ".");
  if (!problems.empty()) throw InputError(problem_list(table.source, problems));
  const auto count = static_cast<Eigen::Index>(channels.size());
  Eigen::MatrixXd full(count, count);
  for (std::size_t i = 0; i < rows.size(); ++i)
    for (std::size_t j = 0; j < columns.size(); ++j)
      full(static_cast<Eigen::Index>(i), static_cast<Eigen::Index>(j)) =
          table.number(rows[i], columns[j]);
  return full;
}

/// Throws unless symmetric to 1e-6 of the largest entry and positive semidefinite.
void check_covariance(const Eigen::MatrixXd& full, const Labels& channels,
                      const std::string& source) {
  const double largest = full.cwiseAbs().maxCoeff();
  Eigen::Index row = 0, column = 0;
  if ((full - full.transpose()).cwiseAbs().maxCoeff(&row, &column) > 1e-6 * largest) {
    const std::string& a = channels[static_cast<std::size_t>(row)];
    const std::string& b = channels[static_cast<std::size_t>(column)];
    throw InputError(
        fmt::format("{}: not symmetric: {} uV^2 in row {}, column {}, but {} in row {}, "
                    "column {}.",
                    source, full(row, column), a, b, full(column, row), b, a));
  }
  const double lowest = Eigen::SelfAdjointEigenSolver<Eigen::MatrixXd>(
                            0.5 * (full + full.transpose()), Eigen::EigenvaluesOnly)
                            .eigenvalues()[0];
  // Entries rounded to 1e-6 of the largest move an eigenvalue by at most #channels times that.
  if (lowest < -1e-6 * largest * static_cast<double>(full.rows()))
    throw InputError(fmt::format(
        "{}: not a covariance: its smallest eigenvalue is {:.4g} uV^2, expected none below 0.",
        source, lowest));
}

}  // namespace

NoiseCovariance estimate_noise(const std::vector<Average>& averages, const NoiseOptions& options) {
  check_averages(averages);
  if (options.from == NoiseOptions::From::trials)
    throw ExperimentError(
        "Noise covariance: single trials are asked for, but there are averages only. Give the "
        "recordings, or take the averages' baseline, their residual or a table.");
  if (options.from == NoiseOptions::From::table)
    return read_noise_table(options.table, averages.front().channels, options.shrinkage);
  const Residuals residuals = options.from == NoiseOptions::From::baseline
                                  ? baseline_residuals(averages, options)
                                  : late_residuals(averages, options);
  const Eigen::Index each = residuals.blocks.front().cols();
  Eigen::MatrixXd samples(residuals.blocks.front().rows(),
                          each * static_cast<Eigen::Index>(residuals.blocks.size()));
  for (std::size_t k = 0; k < residuals.blocks.size(); ++k)
    samples.middleCols(static_cast<Eigen::Index>(k) * each, each) = residuals.blocks[k];
  const auto degrees = static_cast<double>(residuals.degrees);
  Eigen::MatrixXd lags = Eigen::MatrixXd::Zero(each, each);
  for (const Eigen::MatrixXd& block : residuals.blocks) lags += block.transpose() * block;
  const double tau = correlation_factor(lags);
  NoiseCovariance noise;
  noise.channels = averages.front().channels;
  noise.samples = residuals.degrees;
  noise.independent_samples = degrees / tau;
  noise.source = residuals.source;
  const Eigen::MatrixXd covariance = samples * samples.transpose() / degrees;
  shrink_noise(noise, covariance,
               options.shrinkage ? *options.shrinkage
               : options.oas     ? oas_weight(covariance, noise.independent_samples)
                                 : ledoit_wolf_weight(samples, degrees, tau));
  return noise;
}

NoiseCovariance read_noise_table(const std::filesystem::path& path, const Labels& channels,
                                 const std::optional<double>& shrinkage) {
  const Table table = read_table(path, "noise covariance table");
  const Eigen::MatrixXd full = table_matrix(table, channels);
  check_covariance(full, channels, table.source);
  const Eigen::MatrixXd basis = reference_free_basis(full.rows());
  NoiseCovariance noise;
  noise.channels = channels;
  noise.source = "table " + path.filename().string();
  shrink_noise(
      noise,
      basis.transpose() * (0.5 * (full + full.transpose())) * basis * (kMicrovolt * kMicrovolt),
      shrinkage.value_or(0.0));
  return noise;
}

}  // namespace headwater
