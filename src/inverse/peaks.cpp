// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/units.hpp>
#include <headwater/inverse/peaks.hpp>

#include <algorithm>
#include <cmath>

namespace headwater {

std::vector<Peak> find_peaks(const std::vector<std::vector<Eigen::Index>>& neighbours,
                             const Eigen::VectorXd& map, const Eigen::MatrixXd& amplitude,
                             const Eigen::VectorXd& times_s, const SampleRange& samples,
                             const PeakOptions& options) {
  std::vector<Peak> peaks;
  const double largest = map.size() > 0 ? map.maxCoeff() : 0;
  if (!(largest > 0)) return peaks;
  for (Eigen::Index p = 0; p < map.size(); ++p) {
    if (map[p] < options.share_of_largest * largest) continue;
    // Of two equal neighbours the first counts, so that a plateau gives one peak.
    const auto& around = neighbours[static_cast<std::size_t>(p)];
    const bool higher = std::all_of(around.begin(), around.end(), [&](Eigen::Index q) {
      return map[p] > map[q] || (map[p] == map[q] && p < q);
    });
    if (!higher) continue;
    Eigen::Index sample = 0;
    amplitude.row(p).segment(samples.first, samples.count).maxCoeff(&sample);
    peaks.push_back({p, map[p], times_s[samples.first + sample]});
  }
  std::stable_sort(peaks.begin(), peaks.end(),
                   [](const Peak& a, const Peak& b) { return a.value > b.value; });
  if (peaks.size() > static_cast<std::size_t>(options.most))
    peaks.resize(static_cast<std::size_t>(options.most));
  return peaks;
}

bool may_be_merged(const SourceGrid& grid, Eigen::Index point) {
  return std::abs(grid.mni_m(0, point)) <= 20 * kMillimetre + 1e-9 ||
         grid.depth_m[point] > 35 * kMillimetre;
}

}  // namespace headwater
