// SPDX-License-Identifier: GPL-3.0-or-later
// Single trials out of a recording: epochs about events, cleaned by rules that leave a record.
//
// Order of the steps: (1) zero-phase filters over each gap-free segment; (2) epochs, sample nearest
// to the event at 0; (3) drift: a polynomial fitted to the epoch by least squares is subtracted;
// (4) the baseline's mean is subtracted; (5) every n-th sample, counted from 0; (6) bad leads
// (bad_leads.hpp) are found over all trials, then left out or interpolated; (7) trials in which a
// remaining lead breaks a limit are rejected.
//
// Limits of a trial: amplitude in the average reference of the good leads; flatness and step as
// recorded (a restored reference has neither); the first of amplitude, flatness and step that is
// broken is the reason, by its worst lead. To judge leads by how often they break a limit,
// amplitude is taken against the median over leads at each sample: one bad lead must not mark all,
// as it would in the average reference or as the recording's own. Interpolated leads reject
// nothing. Step (4) takes the mean over all recorded samples of the baseline, before some are left
// out.
#pragma once
#include <headwater/signal/average.hpp>
#include <headwater/signal/bad_leads.hpp>
#include <headwater/signal/electrodes.hpp>
#include <headwater/signal/recording.hpp>

#include <Eigen/Core>

#include <functional>
#include <map>
#include <optional>
#include <string>
#include <utility>
#include <vector>

namespace headwater {

/// Which events are a condition's: every named column of the events holds this text (numbers:
/// equal as numbers).
struct EventChoice {
  std::string condition;
  std::map<std::string, std::string> where;  ///< column -> value
};

struct TrialOptions {
  double from_s = -0.1, to_s = 0.6;                     ///< both ends included
  std::optional<std::pair<double, double>> baseline_s;  ///< empty: none
  int drift_degree = -1;                                ///< -1: none; 0: mean; 1: line; ...
  double high_pass_Hz = 0, low_pass_Hz = 0;             ///< 0: none
  int filter_order = 4;                                 ///< of the two passes together: even
  int decimate = 1;
  double reject_V = 0;  ///< largest magnitude in the average reference; 0: no limit
  double flat_V = 0;    ///< peak-to-peak below it is flat; 0: no limit
  double step_V = 0;    ///< largest difference of neighbouring samples; 0: no limit
  BadLeadOptions leads;
};

/// What became of one event.
struct TrialRecord {
  std::size_t event_row = 0;  ///< row of the events table
  double onset_s = 0;
  std::string condition;
  bool kept = false;
  std::string reason;  ///< "", "amplitude", "flat", "step", "outside the recording", "across a gap"
  std::string channel;  ///< worst lead, where a lead is the reason
  double figure = 0;    ///< its value, V; NaN where none
};

/// Trials of one participant. data_V: #channels by (#times * #trials), trial after trial, in the
/// recording's reference (restored `zero` channels included). times: s.
struct Trials {
  Labels channels;
  Eigen::VectorXd times_s;
  Eigen::MatrixXd data_V;
  Labels conditions;                   ///< names, in the order asked for
  std::vector<std::size_t> condition;  ///< of each trial: place in `conditions`
  std::vector<std::size_t> event_row;  ///< of each trial
  std::vector<TrialRecord> records;    ///< of every chosen event, in order of onset
  LeadCheck leads;                     ///< what was found of each lead, bad ones included
  bool baseline_removed = false;       ///< each trial's mean over baseline_s is zero
  std::pair<double, double> baseline_s{0, 0};
  Labels notes;  ///< overlapping epochs, onset jitter, ...

  Eigen::Index count() const { return static_cast<Eigen::Index>(condition.size()); }
  auto trial(Eigen::Index k) const { return data_V.middleCols(k * times_s.size(), times_s.size()); }
  Eigen::Index count_of(std::size_t place) const;
};

/// Positions of a list of leads: standard, or out of the participant's table.
using MontageOf = std::function<Montage(const Labels&)>;

/// Cuts and cleans. `edits` as for averages, by the recording's cleaned names; a name of `drop`
/// or of the bad leads that the recording sets aside already is no error. Memory: the epochs, twice
/// while trials and leads are taken out, plus one channel's segment when filters are on. Epochs of
/// fewer than 8 samples: no lead is looked for, with a note. Errors (InputError): an unknown events
/// column (lists those there), a condition without events (lists the column's values with counts)
/// or without trials left (says why they went), an epoch of no sample or longer than every segment,
/// a baseline outside it, filters above half the sampling rate or (low-pass) above a third of the
/// decimated rate, a decimation without low-pass, fewer than 8 leads left. Events of which the
/// epoch is not wholly inside a segment are recorded as such. An event chosen by two conditions is
/// an error. Overlapping epochs are noted.
Trials cut_trials(const Recording& recording, const ChannelEdits& edits,
                  const std::vector<EventChoice>& choices, const TrialOptions& options,
                  const MontageOf& montage_of);

/// Average of a condition. trim 0: the mean. Else at each channel and sample the share `trim` of
/// trials is left out at each end (trimmed mean); floor(trim n) trials at each end. `trials` is the
/// count; the noise that goes with it is that of winsorised().
Average average_trials(const Trials& trials, std::size_t condition, double trim);

/// Trials whose plain noise is that of the trimmed mean: at each channel and sample, with g =
/// floor(trim n)/n of a condition, values beyond the g and 1-g order statistics are set to these,
/// and the distances from the condition's mean of what results are divided by 1-2g. The variance of
/// their mean is that of the trimmed mean (Tukey & McLaughlin 1963 Sankhya A 25:331), covariances
/// between channels included, which a factor of efficiency would miss.
Trials winsorised(const Trials& trials, double trim);

/// Share of one condition's trials beyond which a peak of its average is biased against another's:
/// a warning when the largest and smallest counts differ by more than a factor 1.5 (the maximum of
/// noise grows as its standard deviation, 1/sqrt(n): by 22 % at 1.5). Empty: none.
std::string count_warning(const std::vector<Average>& averages);

}  // namespace headwater
