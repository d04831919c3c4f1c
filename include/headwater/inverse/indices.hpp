// SPDX-License-Identifier: GPL-3.0-or-later
// Temporal against parietal, left against right: indices on power, with intervals.
//
//   laterality (R - L)/(R + L)   of each lobe, and of all lobes together
//   temporal-parietal (T - P)/(T + P)   left, right, both
// with R, L, T, P the mean over a region's points and the window's samples of the squared
// amplitude. Customary cut for laterality: 0.2 (Brain Struct Funct 2019 224:1377). The interval
// covers the noise of the contrast alone (not the head model, nor the method's own bias towards a
// place): noise of the contrast's covariance is drawn, held constant through the window (the widest
// case), added to the data, and the 2.5 and 97.5 percentiles are taken of the index about its mean
// over draws. The power of the noise itself draws an index towards that of the noise; the distance
// between the mean over draws and the value estimates by how much, and the interval is longer by it
// on the other side (coverage 80 % where the noise prevails).
#pragma once
#include <headwater/inverse/region_courses.hpp>

#include <Eigen/Core>

#include <cstdint>
#include <string>
#include <vector>

namespace headwater {

struct PowerIndex {
  std::string name;          ///< "laterality temporal", "temporal-parietal right"
  double value = 0;          ///< -1 to 1
  double low = 0, high = 0;  ///< 95 % interval
};

struct IndexOptions {
  int draws = 400;
  std::uint64_t seed = 1;
  std::string stream;  ///< name of the random stream, e.g. participant and contrast
};

/// The indices alone, out of the power (mean squared amplitude) of each point. Same names and order
/// as PowerIndices::at; low and high are NaN.
std::vector<PowerIndex> index_values(const Eigen::VectorXd& power,
                                     const std::vector<Region>& lobes);

/// The region powers of one operator as quadratic forms, made once and applied to any number of
/// windows.
class PowerIndices {
 public:
  /// forms: region_forms of the lobes. noise_V2: covariance of the contrast in the subspace (M-1 by
  /// M-1, basis B of M by M-1). Regions without side or lobe are ignored; indices whose two regions
  /// hold no point are left out.
  PowerIndices(const SourceOperator& inverse, const std::vector<Eigen::MatrixXd>& forms,
               const Eigen::MatrixXd& basis, const Eigen::MatrixXd& noise_V2,
               const std::vector<Region>& lobes, const IndexOptions& options);
  /// data_V: M by T of the contrast, any reference.
  std::vector<PowerIndex> at(const Eigen::MatrixXd& data_V, const SampleRange& samples) const;

 private:
  struct Form {
    std::string lobe;
    Side side;
    double points = 0;
    Eigen::MatrixXd matrix;  // Q
  };
  Eigen::MatrixXd map_, noise_maps_;
  std::vector<Form> forms_;
};

}  // namespace headwater
