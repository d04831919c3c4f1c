// SPDX-License-Identifier: GPL-3.0-or-later
// Butterworth's poles in pairs: the analogue section s^2 + s/Q + 1 with 1/Q = 2 sin(pi(2k+1)/(2n)),
// and s + 1 for the odd pole. The bilinear transform s = (1/K) (1 - z^-1)/(1 + z^-1),
// K = tan(pi fc/fs), gives with D = 1 + K/Q + K^2
//   a1 = 2 (K^2 - 1) / D,  a2 = (1 - K/Q + K^2) / D,  low-pass b = b0 (1, 2, 1), high-pass
//   b = b0 (1, -2, 1)
// (Oppenheim & Schafer, Discrete-Time Signal Processing, ch. 7). b0 is taken from the rounded a1,
// a2 such that the gain at 0 (low-pass) or at fs/2 (high-pass) is 1 in spite of the rounding, which
// matters when fc is a small part of fs.
//
// Sections run in the transposed direct form II, y = b0 x + s1, s1 = b1 x - a1 y + s2,
// s2 = b2 x - a2 y. The steady state of a constant x: y = x or 0, s1 = y - b0 x, s2 = b2 x - a2 y.
#include <headwater/base/error.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/zero_phase_filter.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <cmath>
#include <complex>

namespace headwater {
namespace {

constexpr int kHighestOrder = 16;
constexpr double kTimeConstants = 3;

}  // namespace

ZeroPhaseFilter::ZeroPhaseFilter(Kind kind, double cutoff_Hz, int order, double sampling_Hz)
    : sampling_Hz_(sampling_Hz) {
  const char* name = kind == Kind::low_pass ? "low-pass" : "high-pass";
  if (order < 2 || order > kHighestOrder || order % 2 != 0)
    throw ExperimentError(
        fmt::format("The {} filter's order is {}: it must be even, 2 to {} (both passes together).",
                    name, order, kHighestOrder));
  if (!(cutoff_Hz > 0) || !(cutoff_Hz < sampling_Hz / 2))
    throw ExperimentError(
        fmt::format("The {} filter's {} Hz must lie above 0 and below {} Hz, half the sampling "
                    "rate.",
                    name, cutoff_Hz, sampling_Hz / 2));
  const int poles = order / 2;
  const double k = std::tan(kPi * cutoff_Hz / sampling_Hz);
  const double sign = kind == Kind::low_pass ? 1 : -1;
  double slowest = 0;  // samples
  for (int pair = 0; pair < poles / 2; ++pair) {
    const double damping = 2 * std::sin(kPi * (2 * pair + 1) / (2 * poles));
    const double scale = 1 + damping * k + k * k;
    Section section{};
    section.a1 = 2 * (k * k - 1) / scale;
    section.a2 = (1 - damping * k + k * k) / scale;
    section.b0 = section.b2 = (1 + sign * section.a1 + section.a2) / 4;
    section.b1 = 2 * sign * section.b0;
    sections_.push_back(section);
    slowest = std::max(slowest, -2 / std::log(section.a2));  // |pole|^2 = a2
  }
  if (poles % 2 != 0) {
    Section section{};
    section.a1 = (k - 1) / (k + 1);
    section.b0 = (1 + sign * section.a1) / 2;
    section.b1 = sign * section.b0;
    sections_.push_back(section);
    if (section.a1 != 0) slowest = std::max(slowest, -1 / std::log(std::abs(section.a1)));
  }
  passes_constant_ = kind == Kind::low_pass;
  settling_samples_ = std::ceil(kTimeConstants * slowest);
}

void ZeroPhaseFilter::pass(std::vector<double>& signal) const {
  struct State {
    double first, second;
  };
  std::vector<State> states;
  double x = signal.front();
  for (const Section& s : sections_) {
    const double y = passes_constant_ ? x : 0;
    states.push_back({y - s.b0 * x, s.b2 * x - s.a2 * y});
    x = y;
  }
  for (double& sample : signal) {
    double value = sample;
    for (std::size_t i = 0; i < sections_.size(); ++i) {
      const Section& s = sections_[i];
      State& state = states[i];
      const double y = s.b0 * value + state.first;
      state.first = s.b1 * value - s.a1 * y + state.second;
      state.second = s.b2 * value - s.a2 * y;
      value = y;
    }
    sample = value;
  }
}

void ZeroPhaseFilter::apply(std::vector<double>& signal) const {
  if (signal.empty()) return;
  const std::size_t count = signal.size();
  const auto ends =
      static_cast<std::size_t>(std::min(settling_samples_, static_cast<double>(count - 1)));
  std::vector<double> longer(count + 2 * ends);
  std::copy(signal.begin(), signal.end(), longer.begin() + static_cast<std::ptrdiff_t>(ends));
  for (std::size_t k = 1; k <= ends; ++k) {
    longer[ends - k] = 2 * signal.front() - signal[k];
    longer[ends + count - 1 + k] = 2 * signal.back() - signal[count - 1 - k];
  }
  for (int way = 0; way < 2; ++way) {
    pass(longer);
    std::reverse(longer.begin(), longer.end());
  }
  std::copy_n(longer.begin() + static_cast<std::ptrdiff_t>(ends), count, signal.begin());
}

double ZeroPhaseFilter::response(double frequency_Hz) const {
  const std::complex<double> delay = std::polar(1.0, -2 * kPi * frequency_Hz / sampling_Hz_);
  double gain = 1;
  for (const Section& s : sections_)
    gain *=
        std::norm((s.b0 + delay * (s.b1 + delay * s.b2)) / (1.0 + delay * (s.a1 + delay * s.a2)));
  return gain;
}

}  // namespace headwater
