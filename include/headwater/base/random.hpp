// SPDX-License-Identifier: GPL-3.0-or-later
// Random numbers that are the same on every machine, for a seed and a stream name, however many
// threads run: each use takes a stream of its own by name. Generator: xoshiro256++ (Blackman &
// Vigna 2021, ACM Trans Math Softw 47:36), seeded through splitmix64 from seed and an FNV-1a hash
// of the name. Normal deviates by the Box-Muller transform (1958), since the standard library's are
// not specified.
#pragma once
#include <Eigen/Core>

#include <array>
#include <cstdint>
#include <string_view>

namespace headwater {

class RandomStream {
 public:
  RandomStream(std::uint64_t seed, std::string_view name);
  /// 64 uniform bits.
  std::uint64_t bits();
  /// Uniform on [0, 1), 53 bits.
  double uniform();
  /// Standard normal.
  double normal();
  /// #rows by #columns standard normals, filled column by column.
  Eigen::MatrixXd normal_matrix(Eigen::Index rows, Eigen::Index columns);

 private:
  std::array<std::uint64_t, 4> state_;
  double spare_ = 0;
  bool has_spare_ = false;
};

}  // namespace headwater
