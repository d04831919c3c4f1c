// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/parallel.hpp>
#include <headwater/base/random.hpp>

#include <gtest/gtest.h>

#include <atomic>
#include <cmath>
#include <stdexcept>

namespace headwater {
namespace {

TEST(BaseRandom, StreamsDependOnSeedAndNameOnly) {
  RandomStream a(7, "noise"), b(7, "noise"), c(8, "noise"), d(7, "draws");
  const auto first = a.bits();
  EXPECT_EQ(first, b.bits());
  EXPECT_NE(first, c.bits());
  EXPECT_NE(first, d.bits());
}

// Moments of n draws: the standard error of the k-th moment is sqrt(var / n); 5 of them.
TEST(BaseRandom, MomentsOfUniformAndNormal) {
  constexpr int n = 200000;
  RandomStream random(3, "moments");
  double mean = 0;
  for (int i = 0; i < n; ++i) {
    const double u = random.uniform();
    ASSERT_GE(u, 0);
    ASSERT_LT(u, 1);
    mean += u / n;
  }
  EXPECT_NEAR(mean, 0.5, 5 * std::sqrt(1.0 / 12 / n));
  const Eigen::ArrayXd z = random.normal_matrix(n / 4, 4).reshaped().array();
  EXPECT_NEAR(z.mean(), 0, 5 * std::sqrt(1.0 / n));
  EXPECT_NEAR(z.square().mean(), 1, 5 * std::sqrt(2.0 / n));  // var z^2 = 2
  EXPECT_NEAR(z.cube().mean(), 0, 5 * std::sqrt(15.0 / n));   // var z^3 = 15
  EXPECT_NEAR(z.pow(4).mean(), 3, 5 * std::sqrt(96.0 / n));   // var z^4 = 105 - 9
  const double neighbours = (z.head(n - 1) * z.tail(n - 1)).mean();
  EXPECT_NEAR(neighbours, 0, 5 * std::sqrt(1.0 / n));
}

TEST(BaseRandom, MatrixIsFilledByColumns) {
  RandomStream a(1, "m"), b(1, "m");
  const Eigen::MatrixXd matrix = a.normal_matrix(3, 2);
  for (Eigen::Index i = 0; i < 6; ++i) EXPECT_EQ(matrix(i % 3, i / 3), b.normal());
}

TEST(BaseParallel, EveryItemOnceWhateverTheJobs) {
  for (const int jobs : {0, 1, 2, 7})
    for (const std::size_t count : {0u, 1u, 2u, 1000u}) {
      std::vector<std::atomic<int>> seen(count);
      parallel_for(count, jobs, [&](std::size_t i) { ++seen[i]; });
      for (const auto& times : seen) EXPECT_EQ(times, 1);
    }
}

TEST(BaseParallel, AtMostJobsAtOnceAlsoWhenNested) {
  std::atomic<int> now{0}, most{0};
  parallel_for(50, 2, [&](std::size_t) {
    const int running = ++now;
    int before = most;
    while (running > before && !most.compare_exchange_weak(before, running)) {
    }
    parallel_for(20, 2, [](std::size_t) {});
    --now;
  });
  EXPECT_LE(most, 2);
}

TEST(BaseParallel, RethrowsTheExceptionOfABody) {
  for (const int jobs : {1, 2})
    EXPECT_THROW(parallel_for(100, jobs,
                              [](std::size_t i) {
                                if (i == 41) throw std::range_error("item 41");
                              }),
                 std::range_error);
}

}  // namespace
}  // namespace headwater
