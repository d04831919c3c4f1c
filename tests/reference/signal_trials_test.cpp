// SPDX-License-Identifier: GPL-3.0-or-later
// Trials of real people against averages that were made from the same recordings independently:
// EEG Database, Begleiter, UCI, doi 10.24432/C5TS3D. Its README: "trials beyond +-100 uV or flat
// were left out". What that is was found by trying: all 36 counts of trials.tsv come out when a
// trial is left out in which any of the 60 leads (not X, Y, nd, CZ), as recorded (against Cz), goes
// beyond 100 uV or does not vary at all; 32 come out without the mean over time, 35 without the
// flat ones.
#include "signal_support.hpp"

#include <headwater/base/edf.hpp>
#include <headwater/signal/trials.hpp>

#include <gtest/gtest.h>

#include <algorithm>
#include <cmath>
#include <map>

namespace headwater {
namespace {

/// All trials of one person, as recorded, 0 to 996 ms.
Trials all_trials(const std::filesystem::path& edf, const ChannelEdits& edits) {
  TrialOptions options;
  options.from_s = 0;
  options.to_s = 0.999;
  options.leads.find = false;
  std::vector<EventChoice> choices;
  for (const char* kind : {"object", "repeat", "change"})
    choices.push_back({kind, {{"trial_type", kind}}});
  return cut_trials(Recording(edf), edits, choices, options,
                    [](const Labels& labels) { return standard_montage(labels, 0.092); });
}

/// Those that the rule above keeps.
Trials by_the_rule(const Trials& all) {
  Trials kept = all;
  kept.condition.clear();
  std::vector<Eigen::Index> stay;
  for (Eigen::Index k = 0; k < all.count(); ++k) {
    const Eigen::ArrayXXd trial = all.trial(k).topRows(60);  // the last is Cz, zeros
    const bool flat = (trial.rowwise().maxCoeff() - trial.rowwise().minCoeff()).minCoeff() == 0;
    if (flat || trial.abs().maxCoeff() > 100e-6) continue;
    stay.push_back(k);
    kept.condition.push_back(all.condition[static_cast<std::size_t>(k)]);
  }
  const Eigen::Index samples = all.times_s.size();
  kept.data_V.resize(all.data_V.rows(), samples * std::ssize(stay));
  for (Eigen::Index k = 0; k < std::ssize(stay); ++k)
    kept.data_V.middleCols(k * samples, samples) = all.trial(stay[static_cast<std::size_t>(k)]);
  return kept;
}

/// Step of each channel's numbers in the file, V, by the channel's name.
std::map<std::string, double> steps_of(const std::filesystem::path& edf) {
  const EdfFile file(edf);
  const Recording recording(edf);
  std::map<std::string, double> steps;
  for (std::size_t i = 0; i < file.signals().size(); ++i)
    steps[recording.channels()[i].name] =
        std::abs(file.signals()[i].scale) * recording.channels()[i].volts_per_unit;
  return steps;
}

// The tables are rounded to 1e-4 uV (half: 5e-5 uV); the EDF files hold the source's 0.001 uV in
// 16-bit steps of 0.001 to 0.007 uV, rounded to half a step at most, and so is their mean.
TEST(SignalTrialsReference, PicturesAverageToThePublishedTables) {
  NEED_OPEN_DATA(folder, "pictures-averages");
  NEED_OPEN_DATA(recordings, "pictures");
  const TrialCounts counts(read_table(folder / "trials.tsv", "counts"));
  ChannelEdits edits;
  edits.drop = {"X", "Y", "nd", "CZ"};
  edits.rename = pictures_edits().rename;
  edits.zero = {"Cz"};
  int averages = 0;
  for (const auto& table : average_files(folder, "object")) {
    const std::string person = table.filename().string().substr(0, 8);
    const auto edf = recordings / person / "eeg" / (person + "_task-pictures_eeg.edf");
    const Trials trials = by_the_rule(all_trials(edf, edits));
    const auto steps = steps_of(edf);
    for (std::size_t place = 0; place < 3; ++place) {
      const Average made = average_trials(trials, place, 0);
      EXPECT_EQ(made.trials, counts.trials(person, made.condition)) << person << made.condition;
      const Average published = read_average(folder / (person + "_" + made.condition + ".tsv"),
                                             edits, VoltageUnit::microvolt);
      ++averages;
      ASSERT_EQ(made.channels, published.channels);
      ASSERT_EQ(made.data_V.cols(), published.data_V.cols());
      EXPECT_LT((made.times_s - published.times_s).cwiseAbs().maxCoeff(), 1e-8);  // table: 1e-8 s
      const Recording recording(edf);
      for (std::size_t m = 0; m + 1 < made.channels.size(); ++m) {
        const auto row = static_cast<Eigen::Index>(m);
        const double step = steps.at(recording.used_names()[m]);
        EXPECT_LE((made.data_V.row(row) - published.data_V.row(row)).cwiseAbs().maxCoeff(),
                  0.5 * step + 5.001e-11)
            << person << " " << made.condition << " " << made.channels[m];
      }
    }
  }
  EXPECT_EQ(averages, 36);
}

}  // namespace
}  // namespace headwater
