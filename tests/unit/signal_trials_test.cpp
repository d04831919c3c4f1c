// SPDX-License-Identifier: GPL-3.0-or-later
#include "invented_recording.hpp"
#include "trial_support.hpp"

#include <headwater/base/distributions.hpp>
#include <headwater/base/error.hpp>
#include <headwater/base/units.hpp>
#include <headwater/signal/spherical_spline.hpp>
#include <headwater/signal/zero_phase_filter.hpp>

#include <Eigen/Cholesky>
#include <gtest/gtest.h>

#include <cmath>

namespace headwater {
namespace {

Trials cut(const InventedRecording& invented, const TrialOptions& options,
           const ChannelEdits& edits = {},
           const std::vector<EventChoice>& choices = kinds_a_and_b()) {
  return cut_trials(invented.write(), edits, choices, options, standard_cap_montage);
}

TEST(SignalTrials, EpochsAreTheSamplesAboutTheEvent) {
  const InventedRecording invented;
  const Trials trials = cut(invented, plain_cut(-0.1, 0.25));
  ASSERT_EQ(trials.times_s.size(), 71);
  for (Eigen::Index t = 0; t < 71; ++t)
    EXPECT_EQ(trials.times_s(t), static_cast<double>(t - 20) / 200);
  ASSERT_EQ(trials.count(), 18);
  EXPECT_EQ(trials.channels, invented.names);
  EXPECT_EQ(trials.conditions, (Labels{"A", "B"}));
  EXPECT_EQ(trials.count_of(0), 9);
  EXPECT_EQ(trials.count_of(1), 9);
  for (Eigen::Index k = 0; k < 18; ++k) {
    EXPECT_EQ(trials.condition[static_cast<std::size_t>(k)], static_cast<std::size_t>(k % 2));
    EXPECT_EQ(trials.event_row[static_cast<std::size_t>(k)], static_cast<std::size_t>(k));
    const Eigen::MatrixXd expected = 1e-6 * invented.data_uV.middleCols(200 * (k + 1) - 20, 71);
    EXPECT_LE((trials.trial(k) - expected).cwiseAbs().maxCoeff(), 1.001 * invented.rounding_V());
  }
  EXPECT_FALSE(trials.baseline_removed);
  EXPECT_TRUE(trials.notes.empty()) << trials.notes[0];
}

TEST(SignalTrials, BaselineAndDriftAreTakenOff) {
  const InventedRecording invented;
  TrialOptions options = plain_cut(-0.2, 0.3);
  options.baseline_s = {-0.2, 0};
  options.drift_degree = 2;
  const Trials trials = cut(invented, options);
  EXPECT_TRUE(trials.baseline_removed);
  EXPECT_EQ(trials.baseline_s, (std::pair<double, double>(-0.2, 0)));
  Eigen::MatrixXd powers(101, 3);
  for (Eigen::Index t = 0; t < 101; ++t)
    powers.row(t) << 1, trials.times_s(t), std::pow(trials.times_s(t), 2);
  for (Eigen::Index k = 0; k < trials.count(); ++k) {
    EXPECT_LT(trials.trial(k).leftCols(41).rowwise().mean().cwiseAbs().maxCoeff(), 1e-18);
    // Without its mean the rest of a least-squares fit has no line or square in it.
    Eigen::MatrixXd rest = trials.trial(k);
    rest.colwise() -= rest.rowwise().mean().eval();
    EXPECT_LT((rest * powers).cwiseAbs().maxCoeff(), 1e-5 * 1e-10);
  }
}

TEST(SignalTrials, APolynomialVanishesInItsDrift) {
  InventedRecording invented;
  for (Eigen::Index t = 0; t < invented.data_uV.cols(); ++t) {
    const double s = static_cast<double>(t % 200) / 200 - 0.5;  // the same in each second
    invented.data_uV.col(t).setConstant(300 * (0.2 - s + 2 * s * s * s));
  }
  TrialOptions options = plain_cut(-0.45, 0.45);
  options.drift_degree = 3;
  // Epochs within one such second: events in their middles.
  invented.events = "onset\tduration\ttrial_type\tvalue\n";
  for (int k = 0; k < 6; ++k) invented.add_event(2.5 + k, k % 2 == 0 ? "a" : "b", 0);
  const Trials trials = cut(invented, options);
  EXPECT_LE(trials.data_V.cwiseAbs().maxCoeff(), 4 * invented.rounding_V());
}

TEST(SignalTrials, FiltersRunOverTheWholeRecording) {
  const InventedRecording invented;
  TrialOptions options = plain_cut(-0.1, 0.2);
  options.high_pass_Hz = 0.5;
  options.low_pass_Hz = 20;
  const Trials trials = cut(invented, options);
  for (const Eigen::Index lead : {0, 15, 31}) {
    std::vector<double> course(static_cast<std::size_t>(invented.data_uV.cols()));
    Eigen::VectorXd::Map(course.data(), invented.data_uV.cols()) =
        1e-6 * invented.data_uV.row(lead);
    ZeroPhaseFilter(ZeroPhaseFilter::Kind::high_pass, 0.5, 4, 200).apply(course);
    ZeroPhaseFilter(ZeroPhaseFilter::Kind::low_pass, 20, 4, 200).apply(course);
    for (Eigen::Index t = 0; t < trials.times_s.size(); ++t)
      // Filters change the rounding of the file's numbers by at most the sum of their weights'
      // size.
      EXPECT_NEAR(trials.trial(3)(lead, t), course[static_cast<std::size_t>(800 - 20 + t)],
                  4 * invented.rounding_V());
  }
}

TEST(SignalTrials, EveryNthSampleIsCountedFromTheEvent) {
  const InventedRecording invented;
  TrialOptions options = plain_cut(-0.113, 0.2);
  options.low_pass_Hz = 16;
  const Trials full = cut(invented, options);
  options.decimate = 4;
  const Trials few = cut(invented, options);
  ASSERT_EQ(few.times_s.size(), 16);  // -100 to 200 ms, 20 ms apart
  for (Eigen::Index t = 0; t < 16; ++t) {
    EXPECT_EQ(few.times_s(t), static_cast<double>(4 * (t - 5)) / 200);
    EXPECT_TRUE(few.trial(2).col(t) == full.trial(2).col(22 + 4 * (t - 5)));
  }
}

TEST(SignalTrials, ChoosesByTextNumberAndSeveralColumns) {
  const InventedRecording invented;
  const Trials trials =
      cut(invented, plain_cut(0, 0.2), {},
          {{"zero", {{"value", "0"}, {"trial_type", "a"}}}, {"one", {{"value", "1.00"}}}});
  for (std::size_t k = 0; k < trials.event_row.size(); ++k) {
    const std::size_t row = trials.event_row[k];
    EXPECT_EQ(row % 3, trials.condition[k]);
    EXPECT_TRUE(trials.condition[k] == 1 || row % 2 == 0);
  }
  EXPECT_EQ(trials.count_of(0), 3);
  EXPECT_EQ(trials.count_of(1), 6);
}

TEST(SignalTrials, EditsChannelsAndRestoresTheReference) {
  const InventedRecording invented;
  write_file(invented.folder / "rec_channels.tsv", [&] {
    std::string text = "name\ttype\tstatus\n";
    for (const auto& name : invented.names)
      text += name + (name == "Cz" ? "\tMISC\tbad\n" : "\tEEG\tgood\n");
    return text;
  }());
  const Trials trials = cut(invented, plain_cut(0, 0.2), {{"cz", "O1"}, {{"AF3", "AF7"}}, {"Cz"}});
  EXPECT_EQ(trials.channels.size(), 31u);
  EXPECT_EQ(trials.channels.back(), "Cz");
  EXPECT_TRUE(trials.data_V.bottomRows(1).isZero(0));
  EXPECT_FALSE(find_label(trials.channels, "O1"));
  EXPECT_TRUE(find_label(trials.channels, "AF7"));
}

TEST(SignalTrials, RejectsWithReasonLeadAndFigure) {
  InventedRecording invented;
  const auto at = [&](const char* lead, double s) -> double& {
    return invented.data_uV(invented.place(lead), static_cast<Eigen::Index>(std::lround(200 * s)));
  };
  at("F7", 3.1) = 500;                                                             // a, third
  invented.data_uV.row(invented.place("O2")).segment(200 * 6, 60).setConstant(7);  // b
  for (int t = 0; t < 60; ++t) at("Pz", 8 + t / 200.0) += t < 30 ? 45 : -45;       // b, eighth
  TrialOptions options = plain_cut(0, 0.25);
  options.reject_V = 150e-6;
  options.flat_V = 0.5e-6;
  options.step_V = 60e-6;
  const Trials trials = cut(invented, options);
  ASSERT_EQ(trials.records.size(), 18u);
  EXPECT_EQ(trials.count(), 15);
  const TrialRecord& amplitude = trials.records[2];
  EXPECT_EQ(amplitude.reason + amplitude.channel + amplitude.condition, "amplitudeF7A");
  EXPECT_NEAR(amplitude.figure, 500e-6 * 31 / 32, 15e-6);  // in the average reference
  const TrialRecord& flat = trials.records[5];
  EXPECT_EQ(flat.reason + flat.channel + flat.condition, "flatO2B");
  EXPECT_LE(flat.figure, 2 * invented.rounding_V());
  const TrialRecord& step = trials.records[7];
  EXPECT_EQ(step.reason + step.channel, "stepPz");
  EXPECT_NEAR(step.figure, 90e-6, 25e-6);
  for (std::size_t e = 0; e < 18; ++e) {
    EXPECT_EQ(trials.records[e].kept, e != 2 && e != 5 && e != 7);
    EXPECT_EQ(trials.records[e].onset_s, 1.0 + static_cast<double>(e));
    EXPECT_EQ(trials.records[e].kept, std::isnan(trials.records[e].figure));
  }
}

TEST(SignalTrials, RestoredReferenceIsNotFlat) {
  const InventedRecording invented;
  TrialOptions options = plain_cut(0, 0.25);
  options.flat_V = 1e-6;
  EXPECT_EQ(cut(invented, options, {{"Cz"}, {}, {"Cz"}}).count(), 18);
}

TEST(SignalTrials, BadLeadIsLeftOutOrInterpolatedAndDoesNotRejectTrials) {
  InventedRecording invented;
  RandomStream random(2, "bad lead");
  const Eigen::Index c3 = invented.place("C3");
  invented.data_uV.row(c3) = 150 * random.normal_matrix(1, invented.data_uV.cols());
  TrialOptions options = plain_cut(-0.1, 0.4);
  options.reject_V = 120e-6;
  options.leads.find = true;
  const Trials without = cut(invented, options);
  EXPECT_EQ(without.leads.bad(), Labels{"C3"});
  EXPECT_EQ(without.leads.leads.size(), 32u);
  EXPECT_GT(without.leads.leads[static_cast<std::size_t>(c3)].marked, 0.9);
  EXPECT_EQ(without.channels.size(), 31u);
  EXPECT_FALSE(find_label(without.channels, "C3"));
  EXPECT_EQ(without.count(), 18);  // its 500 uV count for nothing
  options.leads.interpolate = true;
  const Trials filled = cut(invented, options);
  EXPECT_EQ(filled.channels, invented.names);
  const Eigen::MatrixXd weights = spline_interpolation(
      standard_cap_montage(without.channels).positions, standard_cap_montage({"C3"}).positions);
  EXPECT_LT((filled.data_V.row(c3) - weights * without.data_V).cwiseAbs().maxCoeff(), 1e-18);
  EXPECT_TRUE(filled.data_V.row(0) == without.data_V.row(0));
}

TEST(SignalTrials, NotesOverlapAndJitter) {
  InventedRecording invented;
  invented.add_event(4.3021, "b", 1);  // 0.42 samples beside one, 0.3 s after an event
  const Trials trials = cut(invented, plain_cut(-0.1, 0.4));
  ASSERT_EQ(trials.notes.size(), 2u);
  EXPECT_EQ(trials.notes[0].substr(0, 26), "1 of 19 epochs overlap the");
  EXPECT_NE(trials.notes[1].find("2.1 ms"), std::string::npos) << trials.notes[1];
  EXPECT_EQ(trials.records[4].onset_s, 4.3021);  // in order of onset
  EXPECT_EQ(trials.records[4].event_row, 18u);
}

TEST(SignalTrials, ShortPiecesUnderAHighPassAreNoted) {
  const InventedRecording invented;
  write_file(invented.folder / "rec_eeg.json",
             R"({"RecordingType": "epoched", "EpochLength": 1, "SamplingFrequency": 200})");
  TrialOptions options = plain_cut(0, 0.5);
  options.high_pass_Hz = 0.1;
  const Trials trials = cut(invented, options);
  EXPECT_EQ(trials.count(), 18);
  ASSERT_EQ(trials.notes.size(), 1u);
  EXPECT_NE(trials.notes[0].find("lasts 1 s"), std::string::npos) << trials.notes[0];
}

TEST(SignalTrials, PlacesEpochsWithinPiecesOnly) {
  InventedRecording invented;
  write_file(invented.folder / "rec_eeg.json",
             R"({"RecordingType": "epoched", "EpochLength": 10, "SamplingFrequency": 200})");
  invented.add_event(0.05, "a", 0);
  invented.add_event(9.9, "a", 0);
  invented.add_event(19.9, "b", 0);
  invented.add_event(25, "b", 0);
  invented.add_event(-3, "b", 0);
  const Trials trials = cut(invented, plain_cut(-0.1, 0.3));
  std::map<double, std::string> reasons;
  for (const TrialRecord& record : trials.records) reasons[record.onset_s] = record.reason;
  EXPECT_EQ(reasons[0.05], "outside the recording");
  EXPECT_EQ(reasons[9.9], "across a gap");
  EXPECT_EQ(reasons[10], "across a gap");  // from -100 ms
  EXPECT_EQ(reasons[19.9], "outside the recording");
  EXPECT_EQ(reasons[25], "outside the recording");
  EXPECT_EQ(reasons[-3], "outside the recording");
  EXPECT_EQ(reasons[12], "");
  EXPECT_EQ(trials.count(), 17);
}

/// Trials of one lead and one sample with these values, condition by turns.
Trials values_of(const std::vector<double>& values) {
  Trials trials;
  trials.channels = {"Cz"};
  trials.times_s = Eigen::VectorXd::Zero(1);
  trials.conditions = {"all"};
  trials.data_V = Eigen::RowVectorXd::Map(values.data(), std::ssize(values));
  trials.condition.assign(values.size(), 0);
  return trials;
}

TEST(SignalTrialAverages, MeanAndTrimmedMean) {
  const Trials trials = values_of({9, 1, 2, 100, 3, 4, 5, -50, 6, 7});
  const Average mean = average_trials(trials, 0, 0);
  EXPECT_DOUBLE_EQ(mean.data_V(0, 0), 8.7);
  EXPECT_EQ(mean.trials, 10);
  EXPECT_DOUBLE_EQ(average_trials(trials, 0, 0.1).data_V(0, 0), 37 / 8.0);  // without 100 and -50
  EXPECT_DOUBLE_EQ(average_trials(trials, 0, 0.19).data_V(0, 0), 37 / 8.0);
  EXPECT_DOUBLE_EQ(average_trials(trials, 0, 0.45).data_V(0, 0), 4.5);          // the median
  EXPECT_DOUBLE_EQ(average_trials(trials, 0, 0.4999999999).data_V(0, 0), 4.5);  // two are left
  EXPECT_DOUBLE_EQ(average_trials(trials, 0, 0.09).data_V(0, 0), 8.7);
  EXPECT_THROW(average_trials(trials, 0, 0.5), ExperimentError);
  EXPECT_THROW(average_trials(trials, 0, -0.1), ExperimentError);
}

// Of one normal variable the variance of a trimmed mean is that of the mean times 1.195176 at g =
// 0.25: z = 0.674490, phi(z) = 0.317777, (0.5 - 2 0.674490 0.317777 + 0.5 0.454937)/0.25 by hand.
TEST(SignalTrialAverages, WinsorisedTrialsHaveTheVarianceOfTheTrimmedMean) {
  constexpr int kCount = 20000;
  std::vector<double> quantiles;
  for (int k = 0; k < kCount; ++k) quantiles.push_back(normal_quantile((k + 0.5) / kCount));
  const Trials plain = values_of(quantiles);
  const Trials clipped = winsorised(plain, 0.25);
  EXPECT_NEAR(clipped.data_V.squaredNorm() / kCount, 1.195176, 1e-3);
  EXPECT_TRUE(winsorised(plain, 0).data_V == plain.data_V);
  EXPECT_EQ(average_trials(plain, 0, 0.25).trials, kCount);
}

// Leads that share nearly all of their noise: trimmed lead by lead they come apart, by more than
// any factor on the count says. Each sample is an independent average; six directions give the mean
// square of 800 a deviation of 2 %. The formula is asymptotic: with few trials the order statistics
// are uncertain themselves, and the smallest directions are overstated.
TEST(SignalTrialAverages, WinsorisedCovarianceIsThatOfTrimmedAverages) {
  Eigen::MatrixXd factor = Eigen::MatrixXd::Zero(6, 7);
  factor.col(6).setOnes();
  factor.leftCols(6) = 0.02 * Eigen::MatrixXd::Identity(6, 6);
  const auto mean_square = [&](int count, bool as_winsorised) {
    RandomStream random(5, "winsorised");
    const Trials trials = noise_trials(random, factor, {count}, 800, 0);
    const Eigen::MatrixXd average = average_trials(trials, 0, 0.25).data_V;
    const Trials of = as_winsorised ? winsorised(trials, 0.25) : trials;
    const Eigen::MatrixXd covariance =
        of.data_V * of.data_V.transpose() / ((count - 1.0) * 800) / count;
    return covariance.ldlt().solve(average * average.transpose() / 800).trace() / 6;
  };
  EXPECT_NEAR(mean_square(1000, true), 1, 0.12);
  EXPECT_NEAR(mean_square(40, true), 0.8, 0.25);
  EXPECT_GT(mean_square(40, false), 1.5);  // what the trials' own covariance would promise
}

TEST(SignalTrialAverages, WarnsOfUnequalCounts) {
  Average few, many;
  few.condition = "rare";
  few.trials = 20;
  many.condition = "often";
  many.trials = 30;
  EXPECT_EQ(count_warning({}), "");
  EXPECT_EQ(count_warning({few, many}), "");
  many.trials = 80;
  const std::string text = count_warning({many, few});
  EXPECT_NE(text.find("80 trials of 'often' but 20 of 'rare'"), std::string::npos) << text;
  EXPECT_NE(text.find("100 %"), std::string::npos) << text;
}

}  // namespace
}  // namespace headwater
