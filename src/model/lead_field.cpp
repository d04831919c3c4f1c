// SPDX-License-Identifier: GPL-3.0-or-later
// Fast kernel of lead_field.hpp. For each point the shells' correction is written as two Legendre
// series in x, so that one recurrence serves both:
//   A = f_inf A_h(x) + sum_n g_n P_n(x),            g_n = (2n+1) b^(n-1) (f_n - f_inf)
//   T = f_inf T_h(x) + sum_n (g_n/n) P_n'(x)
//     = f_inf T_h(x) + sum_k (2k+1) h_k P_k(x),      h_k = g_(k+1)/(k+1) + h_(k+2),
// the last because P_n' = sum over k < n, n-k odd, of (2k+1) P_k. The recurrence runs on multiples
// p_k = s_k P_k, which saves one product a degree (s_k grows as the root of k):
//   s_0 = s_1 = 1,  s_(k+1) = s_(k-1) (k+1)/k,
//   p_(k+1) = c_k x p_k - p_(k-1),  c_k = (2k+1)/(k+1) s_(k+1)/s_k.
// What depends on the degree alone is tabulated once; electrodes are processed in packets. Below
// b = 0.2 the closed form loses digits and the series is short: f_inf is taken as 0 there.
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

/// What depends on the degree n alone, at index n: the shells' factors and the recurrence's
/// constants.
struct Degrees {
  double limit = 1, smallest_factor = 1, largest_factor = 1;
  bool homogeneous = false;
  std::vector<double> factor;      // (2n+1) f_n
  std::vector<double> correction;  // (2n+1) (f_n - f_inf)
  std::vector<double> envelope;    // (2n+1) max over m >= n of |f_m - f_inf|
  std::vector<double> size;        // 2n+1
  std::vector<double> growth;      // (2n+3) / (2n+1)
  std::vector<double> share;       // 1/n
  std::vector<double> unscale;     // 1/s_n
  std::vector<double> step;        // c_n
};

/// Terms that reach the tolerance at eccentricity b whatever the factors are.
Eigen::Index most_terms(double b) {
  Eigen::Index n = 20;
  while (n < kMostTerms &&
         (2.0 * static_cast<double>(n) + 1) * std::pow(b, static_cast<double>(n)) / (1 - b) > 1e-16)
    n += 1 + n / 8;
  return n;
}

Degrees tabulate_degrees(const HeadModel& head, double largest_b) {
  Degrees table;
  const auto& sigma = head.conductivity_S_per_m;
  table.limit = shell_factor_limit(head);
  table.homogeneous = (sigma.array() == sigma[0]).all();
  const Eigen::Index terms = most_terms(table.homogeneous ? kClosedFormFrom : largest_b);
  if (terms >= kMostTerms)
    throw InputError(
        fmt::format("A point lies at {:.9f} of the head's radius: the series of the shells "
                    "does not converge there. Move the point inwards or thicken the outer "
                    "shells.",
                    largest_b));
  const Eigen::VectorXd f = shell_factors(head, terms);
  table.smallest_factor = std::min(f.minCoeff(), table.limit);
  table.largest_factor = f.maxCoeff();
  const auto count = static_cast<std::size_t>(terms) + 2;  // one more makes an even number of terms
  for (auto* column : {&table.factor, &table.correction, &table.envelope})
    column->assign(count, 0.0);
  std::vector<double> scale{1, 1};
  for (std::size_t i = 0; i < count; ++i) {
    const double n = static_cast<double>(i);
    if (i > 0) scale.push_back(scale[i - 1] * (n + 1) / n);
    table.size.push_back(2 * n + 1);
    table.growth.push_back((2 * n + 3) / (2 * n + 1));
    table.share.push_back(i > 0 ? 1 / n : 0);
    table.unscale.push_back(1 / scale[i]);
    table.step.push_back((2 * n + 1) * scale[i + 1] / ((n + 1) * scale[i]));
  }
  double largest = 0;
  for (Eigen::Index n = terms; n > 0; --n) {
    const auto i = static_cast<std::size_t>(n);
    largest = std::max(largest, std::abs(f[n - 1] - table.limit));
    table.factor[i] = table.size[i] * f[n - 1];
    table.correction[i] = table.size[i] * (f[n - 1] - table.limit);
    table.envelope[i] = table.size[i] * largest;
  }
  return table;
}

/// One degree of both series, for p_k.
struct Term {
  double radial = 0, tangential = 0;
};

/// The two Legendre series of one point: the first `count` (an even number) of `terms`.
struct PointSeries {
  double limit = 0;  // factor of the closed form
  std::size_t count = 0;
  std::vector<Term> terms;  // as large as the table
};

/// g_n into `terms`; returns the number of terms that the tolerance asks for.
std::size_t expand_radial(const Degrees& table, double b, bool closed, std::vector<Term>& terms) {
  const double surface_maximum = table.smallest_factor * (3 - b) / ((1 - b) * (1 - b));
  const double tolerance = (closed ? kTailTolerance : kShortTailTolerance) * surface_maximum;
  const double* weight = closed ? table.correction.data() : table.factor.data();
  const double* bound = closed ? table.envelope.data() : table.size.data();
  const double most = closed ? 1 : table.largest_factor;
  terms[0].radial = 0;  // the series begin at n = 1
  double power = 1;
  std::size_t n = 1;
  for (; n + 1 < table.size.size(); ++n) {
    const double rest = 1 - b * table.growth[n];  // the tail is below bound / rest
    if (rest > 0 && power * most * bound[n] < tolerance * rest) break;
    terms[n].radial = weight[n] * power;
    power *= b;
  }
  return n;
}

void expand_point(const Degrees& table, double b, PointSeries& series) {
  const bool closed = b >= kClosedFormFrom;
  series.limit = closed ? table.limit : 0;
  auto& terms = series.terms;
  std::size_t& count = series.count = 0;
  if (!closed || !table.homogeneous) count = expand_radial(table, b, closed, terms);
  if (count % 2 == 1) terms[count++].radial = 0;
  double next = 0, one_up = 0, two_up = 0;  // g_(k+1)/(k+1), h_(k+1), h_(k+2)
  for (std::size_t k = count; k-- > 0;) {
    const double h = next + two_up;
    next = terms[k].radial * table.share[k];
    terms[k].radial *= table.unscale[k];
    terms[k].tangential = table.size[k] * table.unscale[k] * h;
    two_up = one_up;
    one_up = h;
  }
}

/// Sums both series at the cosines x (a multiple of kPacket of them) into a and t.
void sum_series(const PointSeries& series, const std::vector<double>& step, const Eigen::ArrayXd& x,
                Eigen::ArrayXd& a, Eigen::ArrayXd& t) {
  const std::vector<Term>& terms = series.terms;
  for (Eigen::Index row = 0; row < x.size(); row += kPacket) {
    Lanes cosine[kRegisters], even[kRegisters], odd[kRegisters], radial[kRegisters],
        tangential[kRegisters];
    std::memcpy(cosine, x.data() + row, sizeof cosine);
    for (int v = 0; v < kRegisters; ++v) {
      even[v] = Lanes{1, 1, 1, 1};
      odd[v] = radial[v] = tangential[v] = Lanes{0, 0, 0, 0};
    }
    for (std::size_t k = 0; k < series.count; k += 2) {  // two degrees: no state has to be moved
      const Term &first = terms[k], &second = terms[k + 1];
      for (int v = 0; v < kRegisters; ++v) {
        radial[v] += first.radial * even[v];
        tangential[v] += first.tangential * even[v];
        odd[v] = (step[k] * cosine[v]) * even[v] - odd[v];
        radial[v] += second.radial * odd[v];
        tangential[v] += second.tangential * odd[v];
        even[v] = (step[k + 1] * cosine[v]) * odd[v] - even[v];
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
    const Eigen::Array<double, kPacket, 1> cube = inverse * inverse * inverse;
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
  const Degrees table = tabulate_degrees(head, largest_b);

  Eigen::MatrixXd gain(channels, 3 * points_m.cols());
  Eigen::ArrayXd x(packets * kPacket), a(x.size()), t(x.size());
  PointSeries series;
  series.terms.resize(table.size.size());
  for (Eigen::Index p = 0; p < points_m.cols(); ++p) {
    const double r0 = points_m.col(p).norm(), b = r0 / radius;
    const Eigen::Vector3d u =
        r0 > 0 ? Eigen::Vector3d(points_m.col(p) / r0) : Eigen::Vector3d::UnitZ();
    expand_point(table, b, series);
    x = directions.col(0) * u.x() + directions.col(1) * u.y() + directions.col(2) * u.z();
    sum_series(series, table.step, x, a, t);
    if (series.limit != 0) add_closed_form(series.limit, b, x, a, t);
    for (int axis = 0; axis < 3; ++axis)
      gain.col(3 * p + axis) =
          scale * ((a - x * t) * u[axis] + t * directions.col(axis)).head(channels).matrix();
  }
  return gain;
}

}  // namespace headwater
