// SPDX-License-Identifier: GPL-3.0-or-later
// Power of a region is a quadratic form of z = map d: P = mean_t z_t' Q z_t, Q = kernel kernel' / K
// over the region's columns. For data plus a constant noise map e: P = mean z'Qz + 2 mean(z)'Q e +
// e'Qe. So a draw costs a few products of size M-1, whatever the numbers of points and samples.
#include <headwater/base/random.hpp>
#include <headwater/inverse/indices.hpp>

#include <Eigen/Cholesky>

#include <algorithm>
#include <cmath>
#include <limits>
#include <map>
#include <stdexcept>

namespace headwater {
namespace {

struct RegionPower {
  double points = 0;
  double quiet = 0;           // of the data: mean_t z'Qz
  Eigen::RowVectorXd change;  // by each draw of noise
};

/// Sum of the parts weighted by their points, so that a union's power is the mean over its points.
RegionPower united(const RegionPower& a, const RegionPower& b) {
  const double points = a.points + b.points, wa = a.points / points, wb = b.points / points;
  return {points, wa * a.quiet + wb * b.quiet, wa * a.change + wb * b.change};
}

struct Comparison {
  std::string name;
  RegionPower more, less;  // (more - less) / (more + less)
};

double ratio(double more, double less) {
  const double sum = more + less;
  return sum > 0 ? (more - less) / sum : 0;
}

PowerIndex summarise(const Comparison& comparison) {
  PowerIndex index{comparison.name, ratio(comparison.more.quiet, comparison.less.quiet), 0, 0};
  std::vector<double> draws;
  double mean = 0;
  const auto &more = comparison.more, &less = comparison.less;
  for (Eigen::Index k = 0; k < more.change.size(); ++k) {
    draws.push_back(ratio(more.quiet + more.change[k], less.quiet + less.change[k]));
    mean += draws.back() / static_cast<double>(more.change.size());
  }
  std::sort(draws.begin(), draws.end());
  const auto quantile = [&](double q) {
    const double place = q * static_cast<double>(draws.size() - 1);
    const auto low = static_cast<std::size_t>(place);
    const double high = draws[std::min(low + 1, draws.size() - 1)];
    return draws[low] + (place - static_cast<double>(low)) * (high - draws[low]);
  };
  // Noise adds power to both regions and so draws the index towards the noise's own: by about as
  // much as the draws are drawn away from the value. The interval reaches that far back.
  const double bias = mean - index.value;
  index.low = std::max(index.value + quantile(0.025) - mean - std::max(bias, 0.0), -1.0);
  index.high = std::min(index.value + quantile(0.975) - mean + std::max(-bias, 0.0), 1.0);
  return index;
}

std::vector<Comparison> comparisons(
    const std::map<std::pair<std::string, Side>, RegionPower>& power,
    const std::vector<std::string>& lobes) {
  std::vector<Comparison> result;
  const auto find = [&](const std::string& lobe, Side side) -> const RegionPower* {
    const auto at = power.find({lobe, side});
    return at != power.end() ? &at->second : nullptr;
  };
  RegionPower all_left, all_right;
  bool any = false;
  for (const auto& lobe : lobes) {
    const auto *left = find(lobe, Side::left), *right = find(lobe, Side::right);
    if (!left || !right) continue;
    result.push_back({"laterality " + lobe, *right, *left});
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

/// Regions that enter an index.
bool counts(const Region& region) {
  return !region.lobe.empty() && region.side != Side::midline && !region.points.empty();
}

}  // namespace

std::vector<PowerIndex> index_values(const Eigen::VectorXd& power,
                                     const std::vector<Region>& lobes) {
  std::map<std::pair<std::string, Side>, RegionPower> powers;
  std::vector<std::string> names;
  for (const auto& region : lobes) {
    if (!counts(region)) continue;
    powers[{region.lobe, region.side}] = {static_cast<double>(region.points.size()),
                                          power(region.points).mean(), Eigen::RowVectorXd()};
    if (region.side == Side::left) names.push_back(region.lobe);
  }
  constexpr double kNone = std::numeric_limits<double>::quiet_NaN();
  std::vector<PowerIndex> indices;
  for (const auto& [name, more, less] : comparisons(powers, names))
    indices.push_back({name, ratio(more.quiet, less.quiet), kNone, kNone});
  return indices;
}

PowerIndices::PowerIndices(const SourceOperator& inverse, const std::vector<Eigen::MatrixXd>& forms,
                           const Eigen::MatrixXd& basis, const Eigen::MatrixXd& noise_V2,
                           const std::vector<Region>& lobes, const IndexOptions& options)
    : map_(inverse.map) {
  if (options.draws < 2) throw std::logic_error("PowerIndices: an interval needs at least 2 draws");
  if (forms.size() != lobes.size()) throw std::logic_error("PowerIndices: a form for each lobe");
  for (std::size_t k = 0; k < lobes.size(); ++k) {
    const auto& region = lobes[k];
    if (!counts(region)) continue;
    const auto points = static_cast<double>(region.points.size());
    forms_.push_back({region.lobe, region.side, points, forms[k] / points});
  }
  const Eigen::MatrixXd root = noise_V2.llt().matrixL();
  RandomStream random(options.seed, "indices " + options.stream);
  noise_maps_ = map_ * (basis * (root * random.normal_matrix(root.rows(), options.draws)));
}

std::vector<PowerIndex> PowerIndices::at(const Eigen::MatrixXd& data_V,
                                         const SampleRange& samples) const {
  const Eigen::MatrixXd z = map_ * data_V.middleCols(samples.first, samples.count);
  const Eigen::VectorXd mean = z.rowwise().mean();
  std::map<std::pair<std::string, Side>, RegionPower> power;
  std::vector<std::string> lobes;
  for (const auto& form : forms_) {
    RegionPower entry;
    entry.points = form.points;
    entry.quiet = (z.array() * (form.matrix * z).array()).sum() / static_cast<double>(z.cols());
    // The draws are needed as numbers only: slope'e + e'Qe for every draw.
    entry.change = (2 * (form.matrix * mean)).transpose() * noise_maps_;
    entry.change +=
        (noise_maps_.array() * (form.matrix * noise_maps_).array()).colwise().sum().matrix();
    power[{form.lobe, form.side}] = std::move(entry);
    if (form.side == Side::left) lobes.push_back(form.lobe);
  }
  std::vector<PowerIndex> indices;
  for (const auto& comparison : comparisons(power, lobes)) indices.push_back(summarise(comparison));
  return indices;
}

}  // namespace headwater
