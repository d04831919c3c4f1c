// SPDX-License-Identifier: GPL-3.0-or-later
// Bad leads in invented background EEG, over seeds: clean recordings keep their leads, and a lead
// that is spoiled is found. The counts are of fixed seeds; the bounds leave room for one in ten.
#include "lead_support.hpp"

#include <headwater/signal/bad_leads.hpp>

#include <gtest/gtest.h>

#include <functional>

namespace headwater {
namespace {

constexpr int kSeeds = 20;
constexpr Eigen::Index kTrials = 20, kSamples = 150;

using Course = Eigen::MatrixXd;  // 1 by samples
using Spoil = std::function<void(Course&, RandomStream&)>;

struct Counts {
  int found = 0;  ///< spoiled leads called bad
  int most_false = 0, false_in_all = 0;
};

/// Spoils one lead (or none) and counts what is called bad, over the seeds.
Counts count_bad(const Labels& labels, const Spoil& spoil) {
  const Montage montage = standard_montage(labels, 0.092);
  Counts counts;
  for (std::uint64_t seed = 0; seed < kSeeds; ++seed) {
    RandomStream random(seed, "background");
    Eigen::MatrixXd data = background(montage, kTrials, kSamples, random);
    const auto lead =
        static_cast<Eigen::Index>(random.uniform() * static_cast<double>(data.rows()));
    Course course = data.row(lead);
    if (spoil) spoil(course, random);
    data.row(lead) = course;
    const LeadCheck check = check_leads(montage, data, kTrials, {}, {});
    const bool hit = spoil && check.leads[static_cast<std::size_t>(lead)].bad;
    const int wrong = static_cast<int>(check.bad().size()) - (hit ? 1 : 0);
    counts.found += hit;
    counts.most_false = std::max(counts.most_false, wrong);
    counts.false_in_all += wrong;
  }
  return counts;
}

void five_times_noise(Course& course, RandomStream& random) {
  course += 50e-6 * random.normal_matrix(1, course.cols());
}
void flat(Course& course, RandomStream&) {
  course.setZero();
}
/// The level jumps twice in each trial.
void drift_steps(Course& course, RandomStream& random) {
  for (Eigen::Index t = 0; t < course.cols(); t += kSamples / 2)
    course.rightCols(course.cols() - t).array() += 60e-6 * random.normal();
}
void white_noise_of_usual_size(Course& course, RandomStream& random) {
  course = 10e-6 * random.normal_matrix(1, course.cols());
}
/// Like the background's courses, but no neighbour shares it.
void slow_noise_of_usual_size(Course& course, RandomStream& random) {
  course = 10e-6 * random.normal_matrix(1, course.cols());
  for (Eigen::Index t = 1; t < course.cols(); ++t)
    course(t) = 0.95 * course(t - 1) + 0.31 * course(t);
}

class SignalBadLeadsProperty : public testing::TestWithParam<bool> {
 protected:
  Labels labels() const { return GetParam() ? sixty_four_leads() : thirty_two_leads(); }
};

TEST_P(SignalBadLeadsProperty, CleanRecordingsKeepTheirLeads) {
  const Counts counts = count_bad(labels(), {});
  EXPECT_LE(counts.most_false, 1);
  EXPECT_LE(counts.false_in_all, kSeeds / 10);
}

TEST_P(SignalBadLeadsProperty, SpoiledLeadIsFoundAndNoOther) {
  for (const auto& [name, spoil] : std::vector<std::pair<const char*, Spoil>>{
           {"noise", five_times_noise},
           {"steps", drift_steps},
           {"white noise of usual size", white_noise_of_usual_size},
           {"slow noise of usual size", slow_noise_of_usual_size}}) {
    const Counts counts = count_bad(labels(), spoil);
    EXPECT_GE(counts.found, kSeeds - kSeeds / 10) << name;
    EXPECT_LE(counts.most_false, 1) << name;
    EXPECT_LE(counts.false_in_all, kSeeds / 10) << name;
  }
}

// A lead without any signal is, in the average reference, less the mean of all: small, but no less
// than a lead in which the sources cancel. It is found by its size or its neighbours most often;
// always by the limit of flatness, which is the caller's (marked).
TEST_P(SignalBadLeadsProperty, FlatLeadIsMostlyFoundByItsSizeAlone) {
  EXPECT_GE(count_bad(labels(), flat).found, kSeeds * 3 / 4);
}

INSTANTIATE_TEST_SUITE_P(Caps, SignalBadLeadsProperty, testing::Bool(),
                         [](const auto& cap) { return cap.param ? "Leads64" : "Leads32"; });

}  // namespace
}  // namespace headwater
