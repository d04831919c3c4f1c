// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/epochs.hpp"

#include "signal/problems.hpp"

#include <headwater/base/error.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/zero_phase_filter.hpp>

#include <Eigen/QR>
#include <fmt/core.h>

#include <algorithm>
#include <cmath>

namespace headwater {
namespace {

using Index = Eigen::Index;

constexpr double kTolerance = 1e-6;  // of a sample, in times that are meant to be one

/// First and last multiple of step_s in [from_s, to_s]; nothing of what is no number.
std::pair<Index, Index> multiples_in(double from_s, double to_s, double step_s) {
  constexpr double most = 1e15;  // fits an Index
  const double first = std::ceil(from_s / step_s - kTolerance);
  const double last = std::floor(to_s / step_s + kTolerance);
  if (!(first >= -most && last <= most && first <= last)) return {0, -1};
  return {static_cast<Index>(first), static_cast<Index>(last)};
}

Index longest_piece(const Recording& recording) {
  Index longest = 0;
  for (const RecordingSegment& segment : recording.segments())
    longest = std::max(longest, segment.count);
  return longest;
}

void check_filters(double sampling_Hz, const TrialOptions& options,
                   std::vector<std::string>& problems) {
  const auto check_cutoff = [&](const char* name, double cutoff_Hz) {
    if (std::isfinite(cutoff_Hz) && cutoff_Hz >= 0 && cutoff_Hz < sampling_Hz / 2) return;
    problems.push_back(
        fmt::format("the {} of {:g} Hz must lie below {:g} Hz, half the sampling rate.", name,
                    cutoff_Hz, sampling_Hz / 2));
  };
  check_cutoff("high-pass", options.high_pass_Hz);
  check_cutoff("low-pass", options.low_pass_Hz);
  if (options.low_pass_Hz > 0 && options.high_pass_Hz >= options.low_pass_Hz)
    problems.push_back(
        fmt::format("the high-pass of {:g} Hz and the low-pass of {:g} Hz leave "
                    "nothing.",
                    options.high_pass_Hz, options.low_pass_Hz));
  if (options.decimate < 1)
    problems.push_back(
        fmt::format("every {}-th sample cannot be kept: expected 1 or more.", options.decimate));
  if (options.decimate <= 1) return;
  const double highest_Hz = sampling_Hz / options.decimate / 3;
  if (options.low_pass_Hz <= 0 || options.low_pass_Hz > highest_Hz * (1 + 1e-9))
    problems.push_back(fmt::format(
        "to keep every {}-th sample a low-pass of at most {:g} Hz is needed (a third of the rate "
        "that is left, {:g} Hz){}.",
        options.decimate, highest_Hz, 3 * highest_Hz,
        options.low_pass_Hz > 0 ? fmt::format("; it is {:g} Hz", options.low_pass_Hz) : ""));
}

/// Orthonormal basis of the polynomials up to `degree` on `count` samples (count by degree + 1).
Eigen::MatrixXd polynomial_basis(Index count, int degree) {
  Eigen::MatrixXd powers(count, degree + 1);
  const Eigen::VectorXd place = Eigen::VectorXd::LinSpaced(count, -1, 1);
  powers.col(0).setOnes();
  if (degree > 0) powers.col(1) = place;
  for (int n = 1; n < degree; ++n)  // Legendre: well conditioned, unlike plain powers
    powers.col(n + 1) =
        ((2 * n + 1) * place.cwiseProduct(powers.col(n)) - n * powers.col(n - 1)) / (n + 1);
  return powers.householderQr().householderQ() * Eigen::MatrixXd::Identity(count, degree + 1);
}

/// What is done to one channel's epoch, and how it goes into the result.
class EpochCut {
 public:
  EpochCut(const EpochGrid& grid, int drift_degree) : grid_(grid) {
    if (drift_degree >= 0) drift_ = polynomial_basis(grid.count, drift_degree);
  }

  /// epoch: #count samples as recorded (changed); out: the kept ones, `stride` apart.
  void put(Eigen::Ref<Eigen::VectorXd> epoch, double* out, Index stride) const {
    if (drift_.size() > 0) {
      const Eigen::VectorXd weights = drift_.transpose() * epoch;
      epoch.noalias() -= drift_ * weights;
    }
    const double base = grid_.baseline_count > 0
                            ? epoch.segment(grid_.baseline_first, grid_.baseline_count).mean()
                            : 0;
    for (Index k = 0; k < grid_.kept(); ++k) out[k * stride] = epoch(k * grid_.decimate) - base;
  }

 private:
  const EpochGrid& grid_;
  Eigen::MatrixXd drift_;
};

std::vector<ZeroPhaseFilter> make_filters(double sampling_Hz, const TrialOptions& options) {
  using Kind = ZeroPhaseFilter::Kind;
  std::vector<ZeroPhaseFilter> filters;
  if (options.high_pass_Hz > 0)
    filters.emplace_back(Kind::high_pass, options.high_pass_Hz, options.filter_order, sampling_Hz);
  if (options.low_pass_Hz > 0)
    filters.emplace_back(Kind::low_pass, options.low_pass_Hz, options.filter_order, sampling_Hz);
  return filters;
}

}  // namespace

EpochGrid make_grid(const Recording& recording, const TrialOptions& options) {
  const double rate = recording.sampling_Hz();
  std::vector<std::string> problems;
  check_filters(rate, options, problems);
  EpochGrid grid;
  grid.decimate = std::max(1, options.decimate);
  const double step_s = static_cast<double>(grid.decimate) / rate;
  const auto [first, last] = multiples_in(options.from_s, options.to_s, step_s);
  const Index longest = longest_piece(recording);
  const bool too_long = last - first >= longest / grid.decimate + 1;
  if (last < first || too_long) {
    problems.push_back(
        fmt::format("an epoch from {:g} to {:g} ms {}.", options.from_s / kMillisecond,
                    options.to_s / kMillisecond,
                    too_long ? fmt::format("is longer than the longest gap-free piece, {:.4g} s",
                                           static_cast<double>(longest) / rate)
                             : "holds no sample"));
    throw InputError(problem_list(recording.source(), problems));
  }
  grid.first = first * grid.decimate;
  grid.count = (last - first) * grid.decimate + 1;
  grid.times_s.resize(last - first + 1);
  for (Index k = 0; k < grid.times_s.size(); ++k)
    grid.times_s(k) = static_cast<double>((first + k) * grid.decimate) / rate;
  if (options.baseline_s) {
    const auto [from_s, to_s] = *options.baseline_s;
    const auto [begin, end] = multiples_in(from_s, to_s, 1 / rate);
    const Index low = std::max(begin, grid.first),
                high = std::min(end, grid.first + grid.count - 1);
    if (end < begin || high < low)
      problems.push_back(fmt::format(
          "the baseline, {:g} to {:g} ms, holds no sample of the epoch, {:g} to {:g} ms.",
          from_s / kMillisecond, to_s / kMillisecond, options.from_s / kMillisecond,
          options.to_s / kMillisecond));
    grid.baseline_first = low - grid.first;
    grid.baseline_count = high - low + 1;
  }
  if (options.drift_degree + 1 >= grid.count)
    problems.push_back(fmt::format("a drift of degree {} leaves nothing of an epoch of {} samples.",
                                   options.drift_degree, grid.count));
  if (!problems.empty()) throw InputError(problem_list(recording.source(), problems));
  return grid;
}

std::vector<PlacedEpoch> place_epochs(const Recording& recording, const EpochGrid& grid,
                                      const std::vector<ChosenEvent>& events) {
  const auto& segments = recording.segments();
  const double rate = recording.sampling_Hz();
  std::vector<PlacedEpoch> placed;
  for (const ChosenEvent& event : events) {
    PlacedEpoch epoch;
    const auto after =
        std::upper_bound(segments.begin(), segments.end(), event.onset_s + 0.5 / rate,
                         [](double onset_s, const auto& s) { return onset_s < s.onset_s; });
    if (after == segments.begin()) {
      epoch.reason = "outside the recording";
      placed.push_back(epoch);
      continue;
    }
    const auto segment = std::prev(after);
    const double samples = std::round((event.onset_s - segment->onset_s) * rate);
    // Far outside it would not fit an Index.
    const auto zero = static_cast<Index>(std::clamp(samples, -1e15, 1e15));
    const Index begin = zero + grid.first, end = begin + grid.count;
    epoch.segment = static_cast<std::size_t>(segment - segments.begin());
    epoch.jitter_s = event.onset_s - segment->onset_s - samples / rate;
    if (begin >= 0 && end <= segment->count)
      epoch.sample = segment->first + begin;
    else if ((begin < 0 && segment == segments.begin()) ||
             (end > segment->count && after == segments.end()))
      epoch.reason = "outside the recording";
    else
      epoch.reason = "across a gap";
    placed.push_back(epoch);
  }
  return placed;
}

Eigen::MatrixXd read_epochs(const Recording& recording, const std::vector<Index>& channels,
                            const EpochGrid& grid, const std::vector<PlacedEpoch>& placed,
                            const TrialOptions& options) {
  const auto rows = static_cast<Index>(channels.size());
  const auto filters = make_filters(recording.sampling_Hz(), options);
  const EpochCut cut(grid, options.drift_degree);
  Eigen::MatrixXd data =
      Eigen::MatrixXd::Zero(rows, grid.kept() * static_cast<Index>(placed.size()));
  const auto place_of = [&](Index row, std::size_t epoch) {
    return data.data() + static_cast<Index>(epoch) * grid.kept() * rows + row;
  };
  if (filters.empty()) {  // epoch by epoch: what is written stays in the cache
    Eigen::VectorXd epoch(grid.count);
    for (std::size_t e = 0; e < placed.size(); ++e)
      for (Index row = 0; row < rows; ++row) {
        const Index channel = channels[static_cast<std::size_t>(row)];
        if (channel < 0) continue;
        recording.read(static_cast<std::size_t>(channel), *placed[e].sample, grid.count,
                       epoch.data());
        cut.put(epoch, place_of(row, e), rows);
      }
    return data;
  }
  std::vector<double> whole;
  for (Index row = 0; row < rows; ++row) {
    const Index channel = channels[static_cast<std::size_t>(row)];
    if (channel < 0) continue;
    for (std::size_t e = 0; e < placed.size();) {
      const std::size_t segment = placed[e].segment;
      const auto& piece = recording.segments()[segment];
      whole.resize(static_cast<std::size_t>(piece.count));
      recording.read(static_cast<std::size_t>(channel), piece.first, piece.count, whole.data());
      for (const ZeroPhaseFilter& filter : filters) filter.apply(whole);
      for (; e < placed.size() && placed[e].segment == segment; ++e) {
        const double* begin = whole.data() + (*placed[e].sample - piece.first);
        Eigen::VectorXd epoch = Eigen::Map<const Eigen::VectorXd>(begin, grid.count);
        cut.put(epoch, place_of(row, e), rows);
      }
    }
  }
  return data;
}

}  // namespace headwater
