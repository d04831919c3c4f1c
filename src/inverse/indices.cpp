// SPDX-License-Identifier: GPL-3.0-or-later
// Power of a region is a quadratic form of z = map d: P = mean_t z_t' Q z_t, Q = kernel kernel' / K over the
// region's columns. For data plus a constant noise map e: P = mean z'Qz + 2 mean(z)'Q e + e'Qe. So a draw
// costs a few products of size M-1, whatever the numbers of points and samples.
#include <headwater/inverse/indices.hpp>

#include <Eigen/Cholesky>
#include <algorithm>
#include <cmath>
#include <map>

#include <headwater/base/random.hpp>

namespace headwater {
namespace {

struct RegionPower {
  Eigen::MatrixXd form;  // Q
  double points = 0;
  double quiet = 0;        // mean_t z'Qz
  Eigen::VectorXd slope;   // 2 Q mean(z)
  double at(const Eigen::VectorXd& e) const { return quiet + slope.dot(e) + e.dot(form * e); }
};

/// Sum of the parts weighted by their points, so that a union's power is the mean over its points.
RegionPower united(const RegionPower& a, const RegionPower& b) {
  RegionPower sum;
  sum.points = a.points + b.points;
  const double wa = a.points / sum.points, wb = b.points / sum.points;
  sum.form = wa * a.form + wb * b.form;
  sum.quiet = wa * a.quiet + wb * b.quiet;
  sum.slope = wa * a.slope + wb * b.slope;
  return sum;
}

struct Comparison {
  std::string name;
  RegionPower more, less;  // (more - less) / (more + less)
};

double ratio(double more, double less) {
  const double sum = more + less;
  return sum > 0 ? (more - less) / sum : 0;
}

PowerIndex summarise(const Comparison& comparison, const Eigen::MatrixXd& noise_maps) {
  PowerIndex index{comparison.name, ratio(comparison.more.quiet, comparison.less.quiet), 0, 0};
  std::vector<double> draws;
  double mean = 0;
  for (Eigen::Index k = 0; k < noise_maps.cols(); ++k) {
    const Eigen::VectorXd e = noise_maps.col(k);
    draws.push_back(ratio(comparison.more.at(e), comparison.less.at(e)));
    mean += draws.back() / static_cast<double>(noise_maps.cols());
  }
  std::sort(draws.begin(), draws.end());
  const auto quantile = [&](double q) {
    const double place = q * static_cast<double>(draws.size() - 1);
    const auto low = static_cast<std::size_t>(place);
    const double high = draws[std::min(low + 1, draws.size() - 1)];
    return draws[low] + (place - static_cast<double>(low)) * (high - draws[low]);
  };
  index.low = std::max(index.value + quantile(0.025) - mean, -1.0);
  index.high = std::min(index.value + quantile(0.975) - mean, 1.0);
  return index;
}

std::vector<Comparison> comparisons(const std::map<std::pair<std::string, Side>, RegionPower>& power,
                                    const std::vector<Region>& lobes) {
  std::vector<Comparison> result;
  const auto find = [&](const std::string& lobe, Side side) -> const RegionPower* {
    const auto at = power.find({lobe, side});
    return at != power.end() ? &at->second : nullptr;
  };
  RegionPower all_left, all_right;
  bool any = false;
  for (const auto& region : lobes) {
    if (region.side != Side::left) continue;
    const auto *left = find(region.lobe, Side::left), *right = find(region.lobe, Side::right);
    if (!left || !right) continue;
    result.push_back({"laterality " + region.lobe, *right, *left});
    all_left = any ? united(all_left, *left) : *left;
    all_right = any ? united(all_right, *right) : *right;
    any = true;
  }
  if (any) result.insert(result.begin(), {"laterality all", all_right, all_left});
  const auto *tl = find("temporal", Side::left), *tr = find("temporal", Side::right);
  const auto *pl = find("parietal", Side::left), *pr = find("parietal", Side::right);
  if (tl && tr && pl && pr) {
    result.push_back({"temporal-parietal both", united(*tl, *tr), united(*pl, *pr)});
    result.push_back({"temporal-parietal left", *tl, *pl});
    result.push_back({"temporal-parietal right", *tr, *pr});
  }
  return result;
}

}  // namespace

std::vector<PowerIndex> power_indices(const SourceOperator& inverse, const Eigen::MatrixXd& data_V,
                                 const SampleRange& samples, const Eigen::MatrixXd& basis,
                                 const Eigen::MatrixXd& noise_V2, const std::vector<Region>& lobes,
                                 const IndexOptions& options) {
  const Eigen::MatrixXd z = inverse.map * data_V.middleCols(samples.first, samples.count);
  const Eigen::VectorXd mean = z.rowwise().mean();
  std::map<std::pair<std::string, Side>, RegionPower> power;
  for (const auto& region : lobes) {
    if (region.lobe.empty() || region.side == Side::midline || region.points.empty()) continue;
    RegionPower entry;
    entry.points = static_cast<double>(region.points.size());
    Eigen::MatrixXd kernel(z.rows(), static_cast<Eigen::Index>(3 * region.points.size()));
    for (std::size_t k = 0; k < region.points.size(); ++k)
      kernel.middleCols<3>(static_cast<Eigen::Index>(3 * k)) =
          inverse.kernel.middleCols<3>(3 * region.points[k]);
    entry.form = Eigen::MatrixXd::Zero(z.rows(), z.rows());
    entry.form.selfadjointView<Eigen::Lower>().rankUpdate(kernel, 1 / entry.points);
    entry.form = Eigen::MatrixXd(entry.form.selfadjointView<Eigen::Lower>());
    entry.quiet = (z.array() * (entry.form * z).array()).sum() / static_cast<double>(z.cols());
    entry.slope = 2 * entry.form * mean;
    power[{region.lobe, region.side}] = std::move(entry);
  }
  const Eigen::MatrixXd root = noise_V2.llt().matrixL();
  RandomStream random(options.seed, "indices " + options.stream);
  const Eigen::MatrixXd noise_maps =
      inverse.map * (basis * (root * random.normal_matrix(root.rows(), options.draws)));
  std::vector<PowerIndex> indices;
  for (const auto& comparison : comparisons(power, lobes))
    indices.push_back(summarise(comparison, noise_maps));
  return indices;
}

}  // namespace headwater
