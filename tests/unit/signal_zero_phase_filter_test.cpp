// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/error.hpp>
#include <headwater/base/random.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/zero_phase_filter.hpp>

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>

namespace headwater {
namespace {

using Kind = ZeroPhaseFilter::Kind;

struct Case {
  Kind kind;
  double cutoff_Hz;
  int order;
  double sampling_Hz;
};

class SignalZeroPhaseFilter : public testing::TestWithParam<Case> {
 protected:
  ZeroPhaseFilter filter_{GetParam().kind, GetParam().cutoff_Hz, GetParam().order,
                          GetParam().sampling_Hz};
  /// The formula of the header.
  double formula(double f) const {
    const Case& c = GetParam();
    const double ratio =
        std::tan(kPi * f / c.sampling_Hz) / std::tan(kPi * c.cutoff_Hz / c.sampling_Hz);
    return 1 / (1 + std::pow(ratio, c.kind == Kind::low_pass ? c.order : -c.order));
  }
};

// Coefficients are rounded to 1e-16; what counts is that rounding over the squared distance of the
// poles from 1, K^2 = tan(pi fc/fs)^2 >= 6e-6 here: 2e-11, times the order at the steep edge.
TEST_P(SignalZeroPhaseFilter, SectionsHaveTheAnalyticResponse) {
  const Case& c = GetParam();
  for (int k = 1; k < 500; ++k) {
    const double f = c.sampling_Hz / 2 * k / 500;
    EXPECT_NEAR(filter_.response(f), formula(f), 1e-10) << f;
  }
  EXPECT_NEAR(filter_.response(c.cutoff_Hz), 0.5, 1e-9);
  EXPECT_NEAR(filter_.response(0), c.kind == Kind::low_pass ? 1 : 0, 1e-14);
}

TEST_P(SignalZeroPhaseFilter, SinusoidKeepsItsPhaseAndGetsTheGain) {
  const Case& c = GetParam();
  for (const double f : {c.cutoff_Hz, 0.7 * c.cutoff_Hz, 1.3 * c.cutoff_Hz}) {
    const auto wave = [&](int k) { return std::sin(2 * kPi * f * k / c.sampling_Hz + 0.3); };
    // Ends settle as exp(-t / time constant): at order 12 the slowest pole's real part is
    // sin(15 degrees) = 0.26 of 2 pi fc, so that 25 / (2 pi 0.26 fc) seconds leave 1e-11 or so.
    const int margin = static_cast<int>(18 * c.sampling_Hz / c.cutoff_Hz);
    std::vector<double> signal(static_cast<std::size_t>(2 * margin + 100));
    for (int k = 0; k < std::ssize(signal); ++k) signal[static_cast<std::size_t>(k)] = wave(k);
    filter_.apply(signal);
    for (int k = margin; k < margin + 100; ++k)
      EXPECT_NEAR(signal[static_cast<std::size_t>(k)], formula(f) * wave(k), 1e-8);
  }
}

TEST_P(SignalZeroPhaseFilter, ImpulseResponseIsSymmetric) {
  const Case& c = GetParam();
  const auto half = static_cast<std::size_t>(15 * c.sampling_Hz / c.cutoff_Hz);
  std::vector<double> signal(2 * half + 1, 0.0);
  signal[half] = 1;
  filter_.apply(signal);
  double largest = 0;
  for (std::size_t k = 0; k < half; ++k)
    largest = std::max(largest, std::abs(signal[k] - signal[2 * half - k]));
  EXPECT_LT(largest, 1e-9);  // rounding, as above, in both passes
  EXPECT_GT(signal[half], 0);
}

// Rounding of the sections' sums, 1e-16 / K^2.
TEST_P(SignalZeroPhaseFilter, ConstantHasNoTransient) {
  for (const std::size_t count : {1, 2, 7, 3000}) {
    std::vector<double> signal(count, 3.0);
    filter_.apply(signal);
    for (const double value : signal)
      EXPECT_NEAR(value, GetParam().kind == Kind::low_pass ? 3 : 0, 1e-9);
  }
}

// A line is its own point reflection: a low-pass gives it back, ends included, but for what is left
// after three time constants of a start in the steady state of a constant; far inside exactly.
TEST_P(SignalZeroPhaseFilter, LowPassKeepsALineInside) {
  const Case& c = GetParam();
  if (c.kind == Kind::high_pass) return;
  const auto margin = static_cast<std::size_t>(18 * c.sampling_Hz / c.cutoff_Hz);
  std::vector<double> signal;
  for (std::size_t k = 0; k < 2 * margin; ++k) signal.push_back(0.01 * static_cast<double>(k));
  filter_.apply(signal);
  EXPECT_NEAR(signal[margin], 0.01 * static_cast<double>(margin), 1e-7);
}

TEST_P(SignalZeroPhaseFilter, IsLinearAndTheSameBackwards) {
  RandomStream random(5, "filter");
  std::vector<double> a(700), b(700), sum(700);
  for (std::size_t k = 0; k < a.size(); ++k) {
    a[k] = random.normal();
    b[k] = random.normal();
    sum[k] = 2 * a[k] - 3 * b[k];
  }
  filter_.apply(a);
  filter_.apply(b);
  filter_.apply(sum);
  for (std::size_t k = 0; k < a.size(); ++k) EXPECT_NEAR(sum[k], 2 * a[k] - 3 * b[k], 1e-8);
}

INSTANTIATE_TEST_SUITE_P(
    Kinds, SignalZeroPhaseFilter,
    testing::Values(Case{Kind::low_pass, 30, 2, 256}, Case{Kind::low_pass, 40, 4, 1000},
                    Case{Kind::low_pass, 100, 12, 512}, Case{Kind::low_pass, 60, 6, 160},
                    Case{Kind::high_pass, 0.5, 2, 500}, Case{Kind::high_pass, 0.2, 4, 256},
                    Case{Kind::high_pass, 1, 8, 256}, Case{Kind::high_pass, 40, 6, 160}));

TEST(SignalZeroPhaseFilterOptions, RefusesWhatCannotBe) {
  EXPECT_THROW(ZeroPhaseFilter(Kind::low_pass, 30, 3, 256), ExperimentError);
  EXPECT_THROW(ZeroPhaseFilter(Kind::low_pass, 30, 0, 256), ExperimentError);
  EXPECT_THROW(ZeroPhaseFilter(Kind::low_pass, 30, 18, 256), ExperimentError);
  EXPECT_THROW(ZeroPhaseFilter(Kind::low_pass, 128, 4, 256), ExperimentError);
  EXPECT_THROW(ZeroPhaseFilter(Kind::high_pass, 0, 4, 256), ExperimentError);
  EXPECT_THROW(ZeroPhaseFilter(Kind::high_pass, std::nan(""), 4, 256), ExperimentError);
}

TEST(SignalZeroPhaseFilterOptions, NothingStaysNothing) {
  std::vector<double> none;
  ZeroPhaseFilter(Kind::low_pass, 30, 4, 256).apply(none);
  EXPECT_TRUE(none.empty());
}

}  // namespace
}  // namespace headwater
