// SPDX-License-Identifier: GPL-3.0-or-later
// What cannot be cut, and what is said of it.
#include "invented_recording.hpp"

#include <headwater/base/error.hpp>

#include <gtest/gtest.h>

#include <limits>

namespace headwater {
namespace {

std::string refusal(const InventedRecording& invented, const TrialOptions& options,
                    const std::vector<EventChoice>& choices = kinds_a_and_b(),
                    const ChannelEdits& edits = {}) {
  return message_of<InputError>(
      [&] { cut_trials(invented.write(), edits, choices, options, standard_cap_montage); });
}

void expect_parts(const std::string& text, const std::vector<std::string>& parts) {
  for (const std::string& part : parts)
    EXPECT_NE(text.find(part), std::string::npos) << "'" << part << "' is not in: " << text;
}

TEST(SignalTrialsFault, UnknownColumnsAndValuesAreAllListed) {
  const InventedRecording invented;
  expect_parts(refusal(invented, plain_cut(0, 0.2),
                       {{"A", {{"trial_typ", "a"}}}, {"C", {{"trial_type", "c"}}}}),
               {"2 problems", "'A'", "'trial_typ'", "Did you mean 'trial_type'?",
                "onset, duration, trial_type and value", "'C'", "trial_type = c", "9 x a, 9 x b",
                "rec_events.tsv"});
}

TEST(SignalTrialsFault, EventOfTwoConditions) {
  const InventedRecording invented;
  expect_parts(refusal(invented, plain_cut(0, 0.2),
                       {{"A", {{"trial_type", "a"}}}, {"zero", {{"value", "0"}}}}),
               {"3 events of condition 'zero'", "line 2"});
}

TEST(SignalTrialsFault, AnEventThatStandsTwice) {
  InventedRecording invented;
  invented.add_event(5, "a", 1);
  expect_parts(refusal(invented, plain_cut(0, 0.2)),
               {"two events of condition 'A' begin at 5 s", "lines 6 and 20", "twice"});
}

TEST(SignalTrialsFault, EpochsBeyondAnyMachine) {
  InventedRecording invented;
  RandomStream random(8, "long recording");
  invented.data_uV = random.normal_matrix(32, 130 * InventedRecording::rate);
  expect_parts(refusal(invented, plain_cut(0, 105)),
               {"18 epochs of 21001 samples", "20000 samples", "trials.to_ms"});
}

TEST(SignalTrialsFault, NoEvents) {
  InventedRecording invented;
  write_edf(invented.file(), invented.names, invented.rate, invented.data_uV, {});
  expect_parts(message_of<InputError>([&] {
                 cut_trials(Recording(invented.file()), {}, kinds_a_and_b(), plain_cut(0, 0.2),
                            standard_cap_montage);
               }),
               {"no events"});
}

TEST(SignalTrialsFault, OnsetThatIsNoNumber) {
  InventedRecording invented;
  invented.events += "n/a\t0\ta\t0\n";
  expect_parts(refusal(invented, plain_cut(0, 0.2)), {"rec_events.tsv", "20", "onset"});
}

TEST(SignalTrialsFault, AllEventsOutside) {
  const InventedRecording invented;
  expect_parts(refusal(invented, plain_cut(5, 24)),
               {"condition 'A' has no trial left: 9 x outside the recording", "condition 'B'"});
  expect_parts(refusal(invented, plain_cut(1e12, 1e12 + 1)), {"9 x outside the recording"});
}

TEST(SignalTrialsFault, AllTrialsRejected) {
  const InventedRecording invented;
  TrialOptions options = plain_cut(0, 0.2);
  options.reject_V = 1e-6;
  expect_parts(refusal(invented, options),
               {"condition 'A' has no trial left: 9 x amplitude", "Most often at ", "leads.bad"});
}

TEST(SignalTrialsFault, OptionsThatDoNotFitTheRecording) {
  const InventedRecording invented;
  TrialOptions options = plain_cut(0, 0.2);
  options.high_pass_Hz = 120;
  options.low_pass_Hz = 100;
  options.baseline_s = {-0.3, -0.1};
  options.drift_degree = 40;
  expect_parts(refusal(invented, options),
               {"problems", "high-pass of 120 Hz", "below 100 Hz", "low-pass of 100 Hz",
                "the baseline, -300 to -100 ms", "degree 40"});
  options = plain_cut(0, 0.2);
  options.decimate = 2;
  expect_parts(refusal(invented, options), {"low-pass of at most 33.3333 Hz"});
  options.low_pass_Hz = 40;
  expect_parts(refusal(invented, options), {"it is 40 Hz"});
  options.decimate = 0;
  expect_parts(refusal(invented, options), {"every 0-th sample"});
  expect_parts(refusal(invented, plain_cut(0, 30)), {"longest gap-free piece, 20 s"});
  expect_parts(refusal(invented, plain_cut(-1e12, 1e12)), {"longest gap-free piece, 20 s"});
  expect_parts(refusal(invented, plain_cut(0.2, 0.1)), {"holds no sample"});
  expect_parts(refusal(invented, plain_cut(0.001, 0.004)), {"holds no sample"});
  options = plain_cut(0, 0.2);
  options.low_pass_Hz = 40;
  options.filter_order = 3;
  EXPECT_THROW(cut_trials(invented.write(), {}, kinds_a_and_b(), options, standard_cap_montage),
               ExperimentError);
}

TEST(SignalTrialsFault, NotANumber) {
  const InventedRecording invented;
  const double none = std::numeric_limits<double>::quiet_NaN();
  EXPECT_NE(refusal(invented, plain_cut(none, 0.2)), "");
  EXPECT_NE(refusal(invented, plain_cut(0, none)), "");
  TrialOptions options = plain_cut(0, 0.2);
  options.low_pass_Hz = none;
  EXPECT_NE(refusal(invented, options), "");
  options = plain_cut(0, 0.2);
  options.baseline_s = {none, 0};
  EXPECT_NE(refusal(invented, options), "");
}

TEST(SignalTrialsFault, TooFewLeads) {
  const InventedRecording invented;
  TrialOptions options = plain_cut(0, 0.2);
  options.leads.bad = Labels(invented.names.begin(), invented.names.begin() + 25);
  expect_parts(refusal(invented, options), {"7 good leads left", "at least 8", "Fp1"});
  expect_parts(refusal(invented, plain_cut(0, 0.2), kinds_a_and_b(), {{"Qz"}, {}, {}}), {"'Qz'"});
}

}  // namespace
}  // namespace headwater
