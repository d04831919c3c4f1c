// SPDX-License-Identifier: GPL-3.0-or-later
#include "trial_covariance.hpp"

#include <vector>

namespace headwater::reference {

Eigen::MatrixXd pooled_residuals(const Trials& trials, Eigen::Index first, Eigen::Index count,
                                 double degrees) {
  const Eigen::Index channels = trials.data_V.rows(), all = trials.times_s.size();
  Eigen::MatrixXd result = Eigen::MatrixXd::Zero(channels, channels);
  for (std::size_t condition = 0; condition < trials.conditions.size(); ++condition)
    for (Eigen::Index t = first; t < first + count; ++t) {
      std::vector<std::vector<long double>> x;
      for (std::size_t k = 0; k < trials.condition.size(); ++k) {
        if (trials.condition[k] != condition) continue;
        std::vector<long double> sample;
        long double mean = 0;
        for (Eigen::Index m = 0; m < channels; ++m) {
          sample.push_back(trials.data_V(m, static_cast<Eigen::Index>(k) * all + t));
          mean += sample.back() / static_cast<long double>(channels);
        }
        for (long double& value : sample) value -= mean;
        x.push_back(sample);
      }
      for (Eigen::Index i = 0; i < channels; ++i)
        for (Eigen::Index j = 0; j < channels; ++j) {
          const auto a = static_cast<std::size_t>(i), b = static_cast<std::size_t>(j);
          long double first_mean = 0, second_mean = 0, products = 0;
          for (const auto& sample : x) {
            first_mean += sample[a] / static_cast<long double>(x.size());
            second_mean += sample[b] / static_cast<long double>(x.size());
          }
          for (const auto& sample : x)
            products += (sample[a] - first_mean) * (sample[b] - second_mean);
          result(i, j) += static_cast<double>(products / static_cast<long double>(degrees));
        }
    }
  return result;
}

}  // namespace headwater::reference
