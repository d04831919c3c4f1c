// SPDX-License-Identifier: GPL-3.0-or-later
// Bad leads of real people: EEG Database, Begleiter, UCI, doi 10.24432/C5TS3D. What is bad there
// was judged apart from the figures, by what a spline through the other leads leaves of PO7 and
// PO8: 1.3 to 2.4 uV in sub-c344, sub-c369 and sub-c372, as in leads like C1; 6 to 15 uV in eight
// others, a signal that the two share with each other more than either with the leads 2 to 3 cm
// from it.
#include "signal_support.hpp"

#include <headwater/base/random.hpp>
#include <headwater/signal/trials.hpp>

#include <gtest/gtest.h>

#include <algorithm>

namespace headwater {
namespace {

Montage cap(const Labels& labels) {
  return standard_montage(labels, 0.092);
}

Trials trials_of(const std::string& person, bool find) {
  TrialOptions options;
  options.from_s = 0;
  options.to_s = 0.999;
  options.leads.find = find;
  const Recording recording(open_data() / "pictures" / person / "eeg" /
                            (person + "_task-pictures_eeg.edf"));
  return cut_trials(recording, pictures_edits(), {{"all", {{"duration", "1"}}}}, options, cap);
}

#define NEED_PICTURES()                                   \
  if (!std::filesystem::exists(open_data() / "pictures")) \
  GTEST_SKIP() << "the open recordings 'pictures' are not here (HEADWATER_OPEN_DATA)"

TEST(SignalBadLeadsReference, OddPo7AndPo8AreFoundAndGoodLeadsAreKept) {
  NEED_PICTURES();
  for (const char* person : {"sub-c344", "sub-c369", "sub-c370", "sub-c372"})
    EXPECT_EQ(trials_of(person, true).leads.bad(), Labels{}) << person;
  for (const char* person : {"sub-c337", "sub-c342", "sub-c365"})
    EXPECT_EQ(trials_of(person, true).leads.bad(), (Labels{"PO7", "PO8"})) << person;
}

// FP1 of one person made bad, in a copy: noise of 40 uV, about what a loose electrode gives.
TEST(SignalBadLeadsReference, SpoiledFp1IsFound) {
  NEED_PICTURES();
  Trials trials = trials_of("sub-c372", false);
  RandomStream random(1, "FP1");
  const auto row = *find_label(trials.channels, "FP1");
  trials.data_V.row(row) += 40e-6 * random.normal_matrix(1, trials.data_V.cols());
  const LeadCheck check =
      check_leads(cap(trials.channels), trials.data_V, trials.count(), {}, BadLeadOptions{});
  EXPECT_EQ(check.bad(), Labels{"FP1"});
}

}  // namespace
}  // namespace headwater
