// SPDX-License-Identifier: GPL-3.0-or-later
// Butterworth filters run forwards and backwards: no phase, and the response of one pass squared,
//   |H(f)| = 1 / (1 + (tan(pi f/fs) / tan(pi fc/fs))^(+-2n))   + low-pass, - high-pass,
// n the order of one pass (bilinear transform, prewarped at fc): half amplitude at fc. The order
// that users state is that of both passes together, 2n. Ends: the signal is continued by its point
// reflection over three time constants of the slowest pole (at most its own length less one), and
// each pass starts in the steady state of its first sample.
#pragma once
#include <vector>

namespace headwater {

class ZeroPhaseFilter {
 public:
  enum class Kind { low_pass, high_pass };
  /// order: of both passes, even, 2 to 16. 0 < cutoff_Hz < sampling_Hz/2, else ExperimentError.
  ZeroPhaseFilter(Kind kind, double cutoff_Hz, int order, double sampling_Hz);
  void apply(std::vector<double>& signal) const;  ///< in place, whole segment
  /// |H(f)| of both passes, from the sections as they are (not from the formula above).
  double response(double frequency_Hz) const;

 private:
  struct Section {
    double b0, b1, b2, a1, a2;  // a0 = 1
  };
  void pass(std::vector<double>& signal) const;  // forwards, from the steady state
  std::vector<Section> sections_;
  bool passes_constant_ = true;
  double sampling_Hz_ = 0;
  double settling_samples_ = 0;
};

}  // namespace headwater
