// SPDX-License-Identifier: GPL-3.0-or-later
// The paper's section 3.2, in its own symbols: norm |A|^2 = tr(AA')/p, m_n = <S_n, I_n>,
// d_n^2 = |S_n - m_n I|^2, bbar_n^2 = (1/n^2) sum_k |x_k x_k' - S_n|^2, b_n^2 = min(bbar_n^2,
// d_n^2); S* = (b_n^2/d_n^2) m_n I + (a_n^2/d_n^2) S_n.
#include <reference/ledoit_wolf.hpp>

#include <algorithm>

namespace headwater::reference {
namespace {

double squared_norm(const Eigen::MatrixXd& a) {
  return (a * a.transpose()).trace() / static_cast<double>(a.rows());
}

}  // namespace

double ledoit_wolf_weight(const Eigen::MatrixXd& samples) {
  const Eigen::Index p = samples.rows(), n = samples.cols();
  const auto count = static_cast<double>(n);
  const Eigen::MatrixXd identity = Eigen::MatrixXd::Identity(p, p);
  Eigen::MatrixXd s_n = Eigen::MatrixXd::Zero(p, p);
  for (Eigen::Index k = 0; k < n; ++k) s_n += samples.col(k) * samples.col(k).transpose() / count;
  const double m_n = (s_n * identity.transpose()).trace() / static_cast<double>(p);
  const double d2 = squared_norm(s_n - m_n * identity);
  double bbar2 = 0;
  for (Eigen::Index k = 0; k < n; ++k)
    bbar2 += squared_norm(samples.col(k) * samples.col(k).transpose() - s_n) / (count * count);
  const double b2 = std::min(bbar2, d2);
  return b2 / d2;
}

}  // namespace headwater::reference
