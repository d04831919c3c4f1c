// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/random.hpp>
#include <headwater/base/units.hpp>

#include <bit>
#include <cmath>

namespace headwater {
namespace {

/// splitmix64 (Steele, Lea & Flood 2014, OOPSLA): the next state and its mixed value.
std::uint64_t splitmix(std::uint64_t& state) {
  std::uint64_t z = (state += 0x9e3779b97f4a7c15u);
  z = (z ^ (z >> 30)) * 0xbf58476d1ce4e5b9u;
  z = (z ^ (z >> 27)) * 0x94d049bb133111ebu;
  return z ^ (z >> 31);
}

/// 64-bit FNV-1a (Fowler, Noll & Vo).
std::uint64_t hash(std::string_view text) {
  std::uint64_t value = 0xcbf29ce484222325u;
  for (const char c : text) value = (value ^ static_cast<unsigned char>(c)) * 0x100000001b3u;
  return value;
}

}  // namespace

RandomStream::RandomStream(std::uint64_t seed, std::string_view name) : state_{} {
  // The seed is mixed before it meets the hash: neighbouring seeds share no bits with the names.
  std::uint64_t start = splitmix(seed) ^ hash(name);
  for (auto& word : state_) word = splitmix(start);
}

std::uint64_t RandomStream::bits() {
  auto& s = state_;
  const std::uint64_t result = std::rotl(s[0] + s[3], 23) + s[0];
  const std::uint64_t t = s[1] << 17;
  s[2] ^= s[0];
  s[3] ^= s[1];
  s[1] ^= s[2];
  s[0] ^= s[3];
  s[2] ^= t;
  s[3] = std::rotl(s[3], 45);
  return result;
}

double RandomStream::uniform() {
  return static_cast<double>(bits() >> 11) * 0x1p-53;
}

double RandomStream::normal() {
  if (has_spare_) {
    has_spare_ = false;
    return spare_;
  }
  const double radius = std::sqrt(-2 * std::log(1 - uniform()));  // 1 - u is never 0
  const double angle = 2 * kPi * uniform();
  spare_ = radius * std::sin(angle);
  has_spare_ = true;
  return radius * std::cos(angle);
}

Eigen::MatrixXd RandomStream::normal_matrix(Eigen::Index rows, Eigen::Index columns) {
  Eigen::MatrixXd result(rows, columns);
  for (Eigen::Index i = 0; i < result.size(); ++i) result.data()[i] = normal();
  return result;
}

}  // namespace headwater
