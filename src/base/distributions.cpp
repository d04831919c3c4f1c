// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/distributions.hpp>

#include <boost/math/distributions/chi_squared.hpp>
#include <boost/math/distributions/normal.hpp>
#include <boost/math/special_functions/digamma.hpp>
#include <fmt/core.h>

#include <limits>
#include <stdexcept>

namespace headwater {
namespace {

/// Written so that NaN is refused. Boost has its own checks, but an end of the range is an overflow
/// to some of its functions and a value to others.
void check_inside(double x, double low, double high, const char* what) {
  if (!(x > low && x < high))
    throw std::domain_error(
        fmt::format("{} is {}, expected above {} and below {}", what, x, low, high));
}

constexpr double kInfinity = std::numeric_limits<double>::infinity();

}  // namespace

double digamma(double x) {
  check_inside(x, 0, kInfinity, "digamma: x");
  return boost::math::digamma(x);
}

double normal_quantile(double p) {
  check_inside(p, 0, 1, "normal_quantile: probability");
  return boost::math::quantile(boost::math::normal(), p);
}

double chi_squared_quantile(double p, double degrees) {
  check_inside(p, 0, 1, "chi_squared_quantile: probability");
  check_inside(degrees, 0, kInfinity, "chi_squared_quantile: degrees of freedom");
  return boost::math::quantile(boost::math::chi_squared(degrees), p);
}

}  // namespace headwater
