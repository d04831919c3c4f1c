// SPDX-License-Identifier: GPL-3.0-or-later
// How much noise to allow for: the multiplier lambda of the contrast's noise covariance.
//
// In whitened coordinates the linear estimators of this wing fit z = U'y (y whitened by the
// contrast's noise) with filter factors d/(d+lambda), d the eigenvalues of the whitened gram matrix
// K R K'. Choices, all from one eigendecomposition:
//   gcv      minimises sum_t |lambda/(d+lambda) z|^2 / (sum lambda/(d+lambda))^2
//            (Golub, Heath & Wahba 1979 Technometrics 21:215)
//   l-curve  the corner - largest curvature - of log residual against log solution norm
//            (Hansen & O'Leary 1993 SIAM J Sci Comput 14:1487)
//   snr      mean(d) / snr^2: signal over noise in amplitude, over all channels
//   lambda   the user's number, in units of (A m)^-2 times the source weighting's
// GCV and the corner are searched from a tenth of the smallest to ten times the largest eigenvalue.
// Where GCV falls without end towards no regularisation - few components in the window, or a
// covariance whose small directions were raised by shrinkage - the discrepancy principle takes its
// place (Morozov 1966 Sov Math Dokl 7:414): the largest lambda whose whitened residual is not above
// the noise; where even that is out of reach, SNR 3. `rule` says so.
#pragma once
#include <Eigen/Core>

#include <string>

namespace headwater {

struct RegularisationRule {
  enum class Kind { gcv, l_curve, snr, lambda } kind = Kind::gcv;
  double value = 3;  ///< of snr or lambda
};

struct RegularisationChoice {
  double used = 0;                        ///< lambda in use
  double gcv = 0, l_curve = 0, snr3 = 0;  ///< what each rule would take (snr3: SNR of 3)
  double discrepancy = 0;                 ///< NaN where the residual never reaches the noise
  bool gcv_at_edge = false, l_curve_at_edge = false;
  double effective_parameters = 0;  ///< sum d/(d+lambda) at `used`: at most M-1
  std::string rule;  ///< "gcv", "l-curve", "snr 3", "lambda", "discrepancy (gcv has no minimum)"
};

/// d: eigenvalues (>= 0, any order), z: #d by #samples, in coordinates whitened by the contrast's
/// own noise. Throws InputError when z is empty.
RegularisationChoice choose_regularisation(const Eigen::VectorXd& d, const Eigen::MatrixXd& z,
                                           const RegularisationRule& rule);

}  // namespace headwater
