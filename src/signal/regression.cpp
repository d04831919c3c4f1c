// SPDX-License-Identifier: GPL-3.0-or-later
// X = [D | Z], D indicators, Z = Q R the regressors centred within conditions. With the orthonormal
// columns P = [D / sqrt(n_k) | Q] and, for one channel and sample, S = P'y over the trials:
//   beta = R^-1 Q'y,   [(X'X)^-1]_jj = |row j of R^-1|^2,   residual = |y|^2 - |S|^2.
// The difference is of like numbers when y is far from zero; so each condition's first trial is
// subtracted from all of its trials, which leaves beta and residual as they are and takes the
// offset away (shifted data: Chan, Golub & LeVeque 1983 Am Stat 37:242).
//
// A block b left out: P'P = I loses P_b'P_b and S loses S_b, so beta = R^-1 of the last R entries
// of (I - P_b'P_b)^-1 (S - S_b), without the rows of conditions that have no other trial.
//
// Work: Y'Q over M T rows and n trials, in pieces that stay in the cache while the reference and
// the offset are taken from them.
#include "noise_parts.hpp"
#include "regression_design.hpp"

#include <headwater/base/error.hpp>

#include <Eigen/Cholesky>
#include <Eigen/Eigenvalues>
#include <fmt/core.h>

#include <algorithm>
#include <cmath>

namespace headwater {
namespace {

using Eigen::Index;
using Eigen::MatrixXd;
using Eigen::VectorXd;

/// Trials of block b of `blocks`: [first, last).
std::pair<Index, Index> block_trials(Index b, Index blocks, Index trials) {
  return {b * trials / blocks, (b + 1) * trials / blocks};
}

/// Sums over trials, by block. Rows: channel by channel within sample by sample, as in the data.
struct Sums {
  std::vector<MatrixXd> projected;  ///< of each block: M T by K + R, y times P
  VectorXd squares;                 ///< M T
};

/// The average-referenced samples [from, from + count) of a trial, less `offset`, into `out`.
template <typename Column, typename Offset>
void referenced(const double* trial, Index channels, Index from, Index count, const Offset& offset,
                Column&& out) {
  for (Index t = 0; t < count; ++t) {
    const Eigen::Map<const VectorXd> sample(trial + (from + t) * channels, channels);
    const double mean = sample.sum() / static_cast<double>(channels);
    out.segment(t * channels, channels) =
        sample.array() - mean - offset.segment(t * channels, channels).array();
  }
}

/// One piece of samples, all trials.
void add_samples(Sums& sums, const Trials& trials, const Design& design, Index from, Index count) {
  constexpr Index kTogether = 48;
  const Index channels = trials.data_V.rows(), rows = channels * count;
  const Index stride = channels * trials.times_s.size(), groups = design.groups();
  const auto data_of = [&](Index i) {
    return trials.data_V.data() + design.trials[static_cast<std::size_t>(i)] * stride;
  };
  const auto group_of = [&](Index i) { return design.group[static_cast<std::size_t>(i)]; };
  MatrixXd offset = MatrixXd::Zero(rows, groups);
  std::vector<bool> known(static_cast<std::size_t>(groups), false);
  for (Index i = 0; i < design.count(); ++i) {
    if (known[static_cast<std::size_t>(group_of(i))]) continue;
    known[static_cast<std::size_t>(group_of(i))] = true;
    referenced(data_of(i), channels, from, count, VectorXd::Zero(rows).eval(),
               offset.col(group_of(i)));
  }
  auto squares = sums.squares.segment(channels * from, rows);
  MatrixXd piece(rows, kTogether), projected(rows, design.regressors());
  const auto blocks = static_cast<Index>(sums.projected.size());
  for (Index b = 0; b < blocks; ++b) {
    const auto [first, last] = block_trials(b, blocks, design.count());
    auto block = sums.projected[static_cast<std::size_t>(b)].middleRows(channels * from, rows);
    projected.setZero();
    for (Index start = first; start < last; start += kTogether) {
      const Index together = std::min(kTogether, last - start);
      for (Index i = 0; i < together; ++i) {
        const Index group = group_of(start + i);
        auto y = piece.col(i);
        referenced(data_of(start + i), channels, from, count, offset.col(group), y);
        squares += y.cwiseAbs2();
        block.col(group) += y;
      }
      projected.noalias() += piece.leftCols(together) * design.q.middleRows(start, together);
    }
    block.rightCols(design.regressors()) = projected;
    block.leftCols(groups).array().rowwise() /= design.group_size.transpose().array().sqrt();
  }
}

Sums sum_trials(const Trials& trials, const Design& design, Index blocks) {
  constexpr Index kRows = 512;  // times kTogether: what a core's cache holds
  const Index channels = trials.data_V.rows(), samples = trials.times_s.size();
  Sums sums;
  sums.squares = VectorXd::Zero(channels * samples);
  sums.projected.assign(static_cast<std::size_t>(std::max<Index>(blocks, 1)),
                        MatrixXd::Zero(channels * samples, design.groups() + design.regressors()));
  const Index each = std::max<Index>(1, kRows / channels);
  for (Index from = 0; from < samples; from += each)
    add_samples(sums, trials, design, from, std::min(each, samples - from));
  return sums;
}

/// M by T out of M T by 1.
MatrixXd shaped(const VectorXd& column, Index channels) {
  return Eigen::Map<const MatrixXd>(column.data(), channels, column.size() / channels);
}

/// Coefficients without block b.
std::vector<MatrixXd> without_block(Index b, Index blocks, const MatrixXd& rest,
                                    const Design& design, Index channels) {
  const Index groups = design.groups(), columns = rest.cols();
  const auto [first, last] = block_trials(b, blocks, design.count());
  MatrixXd own = MatrixXd::Zero(last - first, columns);  // P_b
  VectorXd left = design.group_size;
  for (Index i = first; i < last; ++i) {
    const Index group = design.group[static_cast<std::size_t>(i)];
    own(i - first, group) = 1 / std::sqrt(design.group_size[group]);
    left[group] -= 1;
  }
  own.rightCols(design.regressors()) = design.q.middleRows(first, last - first);
  MatrixXd gram = MatrixXd::Identity(columns, columns) - own.transpose() * own;
  for (Index group = 0; group < groups; ++group)
    if (left[group] == 0) {  // the column is gone: it is made to stand alone, at any value
      gram.row(group).setZero();
      gram.col(group).setZero();
      gram(group, group) = 1;
    }
  const double lowest =
      Eigen::SelfAdjointEigenSolver<MatrixXd>(gram, Eigen::EigenvaluesOnly).eigenvalues()[0];
  if (!(lowest > 1e-10))
    throw InputError(fmt::format(
        "Regression: without trials {} to {} (block {} of {}) the regressors cannot be told "
        "apart any more, or one is constant. Leave one out, or ask for other blocks.",
        first + 1, last, b + 1, blocks));
  const MatrixXd inverse = gram.llt().solve(MatrixXd::Identity(columns, columns));
  const MatrixXd weights = design.inverse * inverse.bottomRows(design.regressors());
  std::vector<MatrixXd> betas;
  for (Index j = 0; j < design.regressors(); ++j)
    betas.push_back(shaped(rest * weights.row(j).transpose(), channels));
  return betas;
}

}  // namespace

RegressionResult regress(const Trials& trials, const std::vector<Regressor>& regressors,
                         const RegressionOptions& options, int blocks) {
  const Design design = make_design(trials, regressors, options);
  if (blocks < 0 || blocks == 1 || blocks > design.count())
    throw ExperimentError(fmt::format(
        "Regression: {} blocks of {} trials, expected 0 (none is left out) or at least 2.", blocks,
        design.count()));
  const Sums sums = sum_trials(trials, design, blocks);
  const Index channels = trials.data_V.rows();
  MatrixXd total = sums.projected.front();
  for (std::size_t b = 1; b < sums.projected.size(); ++b) total += sums.projected[b];
  RegressionResult result;
  for (const Regressor& regressor : regressors) result.names.push_back(regressor.name);
  result.trials = design.count();
  result.degrees = design.count() - design.groups() - design.regressors();
  result.mean = design.mean;
  result.deviation = design.deviation;
  result.inflation = design.inflation;
  result.effective_trials = design.variance().cwiseInverse();
  result.notes = design.notes;
  // Where the fit is exact, rounding may leave a residual below zero.
  const VectorXd deviation = ((sums.squares - total.rowwise().squaredNorm()).cwiseMax(0) /
                              static_cast<double>(result.degrees))
                                 .cwiseSqrt();
  for (Index j = 0; j < design.regressors(); ++j) {
    const VectorXd beta = total.rightCols(design.regressors()) * design.inverse.row(j).transpose();
    result.beta_V.push_back(shaped(beta, channels));
    result.standard_error_V.push_back(
        shaped(deviation / std::sqrt(result.effective_trials[j]), channels));
  }
  for (Index b = 0; b < blocks; ++b)
    result.without_block.push_back(without_block(
        b, blocks, total - sums.projected[static_cast<std::size_t>(b)], design, channels));
  return result;
}

ContrastWaveform coefficient_contrast(const std::string& name, const RegressionResult& result,
                                      std::size_t regressor, const Trials& trials,
                                      const NoiseCovariance& noise) {
  ContrastWaveform contrast;
  contrast.name = name;
  contrast.channels = trials.channels;
  contrast.times_s = trials.times_s;
  contrast.data_V = result.beta_V.at(regressor);
  contrast.effective_trials = result.effective_trials[static_cast<Index>(regressor)];
  contrast.noise_V2 = covariance_of(noise, trials.channels) / contrast.effective_trials;
  return contrast;
}

}  // namespace headwater
