// SPDX-License-Identifier: GPL-3.0-or-later
// Fast kernel of lead_field.hpp. For each point the shells' correction is written as two Legendre
// series in x, so that one recurrence serves both:
//   A = f_inf A_h(x) + sum_n g_n P_n(x),            g_n = (2n+1) b^(n-1) (f_n - f_inf)
//   T = f_inf T_h(x) + sum_n (g_n/n) P_n'(x)
//     = f_inf T_h(x) + sum_k (2k+1) h_k P_k(x),      h_k = g_(k+1)/(k+1) + h_(k+2),
// the last because P_n' = sum over k < n, n-k odd, of (2k+1) P_k. Electrodes are processed in
// packets. Below b = 0.2 the closed form loses digits and the series is short: f_inf is taken as 0
// there.
#include <headwater/base/error.hpp>
#include <headwater/base/units.hpp>
#include <headwater/model/lead_field.hpp>
#include <headwater/model/sphere_series.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <cmath>
#include <cstring>
#include <vector>

namespace headwater {
namespace {

// Electrodes go through the recurrence eight at a time, in two vector registers of four (GCC and
// Clang vector types: portable, and lowered to what the machine has).
using Lanes [[gnu::vector_size(32)]] = double;
constexpr int kLanes = 4, kRegisters = 2, kPacket = kLanes * kRegisters;

constexpr double kClosedFormFrom = 0.2;        // eccentricity b
constexpr double kTailTolerance = 1e-10;       // of the radial dipole's surface maximum
constexpr double kShortTailTolerance = 1e-15;  // below kClosedFormFrom
constexpr Eigen::Index kMostTerms = 200000;

/// f_n - f_inf, and the largest size of it from n on, for every n that any point may need.
struct ShellCorrection {
  double limit = 1;
  double smallest_factor = 1;
  Eigen::VectorXd factor;    // f_n at index n-1
  Eigen::VectorXd envelope;  // max over m >= n of |f_m - f_inf|
  bool homogeneous = false;
};

/// Terms that reach the tolerance at eccentricity b whatever the factors are.
Eigen::Index most_terms(double b) {
  Eigen::Index n = 20;
  while (n < kMostTerms &&
         (2.0 * static_cast<double>(n) + 1) * std::pow(b, static_cast<double>(n)) / (1 - b) > 1e-16)
    n += 1 + n / 8;
  return n;
}

ShellCorrection correct_shells(const HeadModel& head, double largest_b) {
  ShellCorrection shells;
  const auto& sigma = head.conductivity_S_per_m;
  shells.limit = shell_factor_limit(head);
  shells.homogeneous = (sigma.array() == sigma[0]).all();
  const Eigen::Index terms = most_terms(shells.homogeneous ? kClosedFormFrom : largest_b);
  if (terms >= kMostTerms)
    throw InputError(
        fmt::format("A point lies at {:.9f} of the head's radius: the series of the shells "
                    "does not converge there. Move the point inwards or thicken the outer "
                    "shells.",
                    largest_b));
  shells.factor = shell_factors(head, terms);
  shells.smallest_factor = std::min(shells.factor.minCoeff(), shells.limit);
  shells.envelope = (shells.factor.array() - shells.limit).abs();
  for (Eigen::Index n = terms - 1; n > 0; --n)
    shells.envelope[n - 1] = std::max(shells.envelope[n - 1], shells.envelope[n]);
  return shells;
}

/// One degree of both series, beside the recurrence P_(k+1) = up x P_k - down P_(k-1).
struct Term {
  double radial = 0, tangential = 0, up = 0, down = 0;
};

/// The two Legendre series of one point, an even number of terms.
struct PointSeries {
  double limit = 0;  // factor of the closed form
  std::vector<Term> terms;
};

/// g_n of the series: returns how many terms the tolerance asks for.
void expand_radial(const ShellCorrection& shells, double b, bool closed, std::vector<Term>& terms) {
  const double surface_maximum = shells.smallest_factor * (3 - b) / ((1 - b) * (1 - b));
  const double tolerance = (closed ? kTailTolerance : kShortTailTolerance) * surface_maximum;
  const double limit = closed ? shells.limit : 0, largest_factor = shells.factor.maxCoeff();
  double power = 1;
  for (Eigen::Index i = 0; i < shells.factor.size(); ++i) {
    const double n = static_cast<double>(i + 1), weight = (2 * n + 1) * power;
    const double bound = weight * (closed ? shells.envelope[i] : largest_factor);
    const double ratio = b * (2 * n + 3) / (2 * n + 1);
    if (ratio < 1 && bound < tolerance * (1 - ratio)) break;
    terms.push_back({weight * (shells.factor[i] - limit), 0, 0, 0});
    power *= b;
  }
}

void expand_point(const ShellCorrection& shells, double b, PointSeries& series) {
  const bool closed = b >= kClosedFormFrom;
  series.limit = closed ? shells.limit : 0;
  auto& terms = series.terms;
  terms.assign(1, Term{});  // the series begin at n = 1
  if (!closed || !shells.homogeneous) expand_radial(shells, b, closed, terms);
  if (terms.size() % 2 == 1) terms.push_back({});
  double one_up = 0, two_up = 0;  // h_(k+1), h_(k+2)
  for (std::size_t k = terms.size(); k-- > 0;) {
    const double n = static_cast<double>(k);
    const double next = k + 1 < terms.size() ? terms[k + 1].radial / (n + 1) : 0;
    const double h = next + two_up;
    terms[k].tangential = (2 * n + 1) * h;
    terms[k].up = (2 * n + 1) / (n + 1);
    terms[k].down = n / (n + 1);
    two_up = one_up;
    one_up = h;
  }
}

/// Sums both series at the cosines x (a multiple of kPacket of them) into a and t.
void sum_series(const std::vector<Term>& terms, const Eigen::ArrayXd& x, Eigen::ArrayXd& a,
                Eigen::ArrayXd& t) {
  for (Eigen::Index row = 0; row < x.size(); row += kPacket) {
    Lanes cosine[kRegisters], even[kRegisters], odd[kRegisters], radial[kRegisters],
        tangential[kRegisters];
    std::memcpy(cosine, x.data() + row, sizeof cosine);
    for (int v = 0; v < kRegisters; ++v) {
      even[v] = Lanes{1, 1, 1, 1};
      odd[v] = radial[v] = tangential[v] = Lanes{0, 0, 0, 0};
    }
    for (std::size_t k = 0; k < terms.size(); k += 2) {  // two degrees: no state has to be moved
      const Term &first = terms[k], &second = terms[k + 1];
      for (int v = 0; v < kRegisters; ++v) {
        radial[v] += first.radial * even[v];
        tangential[v] += first.tangential * even[v];
        odd[v] = (first.up * cosine[v]) * even[v] - first.down * odd[v];
        radial[v] += second.radial * odd[v];
        tangential[v] += second.tangential * odd[v];
        even[v] = (second.up * cosine[v]) * odd[v] - second.down * even[v];
      }
    }
    std::memcpy(a.data() + row, radial, sizeof radial);
    std::memcpy(t.data() + row, tangential, sizeof tangential);
  }
}

/// Adds the homogeneous sphere's closed form.
void add_closed_form(double limit, double b, const Eigen::ArrayXd& x, Eigen::ArrayXd& a,
                     Eigen::ArrayXd& t) {
  for (Eigen::Index row = 0; row < x.size(); row += kPacket) {
    const Eigen::Array<double, kPacket, 1> cosine = x.segment<kPacket>(row);
    const Eigen::Array<double, kPacket, 1> square = 1 + b * b - 2 * b * cosine;
    const Eigen::Array<double, kPacket, 1> distance = square.sqrt(), inverse = 1 / distance;
    const Eigen::Array<double, kPacket, 1> cube = inverse / square;
    a.segment<kPacket>(row) += limit / b * ((1 - b * b) * cube - 1);
    t.segment<kPacket>(row) +=
        limit * (2 * cube + (1 + distance) * inverse / (1 - b * cosine + distance));
  }
}

void check_points(const HeadModel& head, const Eigen::Ref<const Eigen::Matrix3Xd>& electrodes,
                  const Eigen::Ref<const Eigen::Matrix3Xd>& points_m) {
  for (Eigen::Index m = 0; m < electrodes.cols(); ++m)
    if (!electrodes.col(m).allFinite() || electrodes.col(m).squaredNorm() == 0)
      throw InputError(
          fmt::format("Electrode {} has no direction: its position is the origin or not a "
                      "number.",
                      m + 1));
  const double brain = head.radii_m[0];
  for (Eigen::Index p = 0; p < points_m.cols(); ++p) {
    const double r = points_m.col(p).norm();
    if (!(r < brain))
      throw InputError(
          fmt::format("Point {} lies {:g} mm from the centre, outside the innermost shell "
                      "({:g} mm): sources belong inside it. Are the points in the head frame "
                      "and in mm?",
                      p + 1, r / kMillimetre, brain / kMillimetre));
  }
}

}  // namespace

Eigen::MatrixXd compute_gain(const HeadModel& head,
                             const Eigen::Ref<const Eigen::Matrix3Xd>& electrodes,
                             const Eigen::Ref<const Eigen::Matrix3Xd>& points_m) {
  check_head(head);
  check_points(head, electrodes, points_m);
  const auto outer = head.radii_m.size() - 1;
  const double radius = head.radii_m[outer];
  const double scale = 1 / (4 * kPi * head.conductivity_S_per_m[outer] * radius * radius);
  const Eigen::Index channels = electrodes.cols(), packets = (channels + kPacket - 1) / kPacket;
  // Padded with copies of the z axis; the padding's results are thrown away.
  Eigen::ArrayX3d directions = Eigen::ArrayX3d::Zero(packets * kPacket, 3);
  directions.col(2).setOnes();
  directions.topRows(channels) = electrodes.colwise().normalized().transpose().array();

  const double largest_b = points_m.cols() > 0 ? points_m.colwise().norm().maxCoeff() / radius : 0;
  const ShellCorrection shells = correct_shells(head, largest_b);

  Eigen::MatrixXd gain(channels, 3 * points_m.cols());
  Eigen::ArrayXd x(packets * kPacket), a(x.size()), t(x.size());
  PointSeries series;
  for (Eigen::Index p = 0; p < points_m.cols(); ++p) {
    const double r0 = points_m.col(p).norm(), b = r0 / radius;
    const Eigen::Vector3d u =
        r0 > 0 ? Eigen::Vector3d(points_m.col(p) / r0) : Eigen::Vector3d::UnitZ();
    expand_point(shells, b, series);
    x = directions.col(0) * u.x() + directions.col(1) * u.y() + directions.col(2) * u.z();
    sum_series(series.terms, x, a, t);
    if (series.limit != 0) add_closed_form(series.limit, b, x, a, t);
    for (int axis = 0; axis < 3; ++axis)
      gain.col(3 * p + axis) =
          scale * ((a - x * t) * u[axis] + t * directions.col(axis)).head(channels).matrix();
  }
  return gain;
}

}  // namespace headwater
