// SPDX-License-Identifier: GPL-3.0-or-later
// One participant's data, ready to be located; and the mean over participants as one more.
#pragma once
#include <headwater/app/forward_model.hpp>
#include <headwater/signal/bad_leads.hpp>
#include <headwater/signal/regression.hpp>
#include <headwater/signal/trial_covariance.hpp>

#include <memory>
#include <optional>
#include <string>
#include <vector>

namespace headwater {

/// Name and folder of the mean over participants.
inline constexpr const char* kMeanName = "mean";

/// A contrast with part of the data left out: one matrix (M by T_w, as the contrast's data) for
/// each of the contrast's windows.
struct PartLeftOut {
  std::string kind, name;  ///< "trials", "block 2 of 5"; "participant", "sub-03"
  std::vector<Eigen::MatrixXd> windows_V;
};

/// What single trials gave beside their averages.
struct TrialsSummary {
  std::vector<TrialRecord> records;   ///< every chosen event
  RegressionResult regression;        ///< names empty: none
  std::vector<Regressor> predictors;  ///< of every event, in the order of regression.names
  std::optional<NormalBelief> prior;  ///< of the ideal observer, where there is one
};

struct ParticipantData {
  std::string name;
  std::optional<TrialsSummary> trials;
  ParticipantCap cap;
  LeadCheck leads;  ///< figures of every lead; of averages: for information
  Whiteness whiteness;
  Labels notes;                             ///< what to know about this participant's data
  std::vector<Average> averages;            ///< one for each condition, in the experiment's order
  NoiseCovariance noise;                    ///< of a single trial
  Eigen::MatrixXd data_covariance_V2;       ///< of single trials, for LCMV; empty: of the averages
  std::vector<ContrastWaveform> contrasts;  ///< in the experiment's order
  std::vector<std::vector<PartLeftOut>> parts;  ///< of each contrast; empty: nothing to leave out
  std::shared_ptr<const ForwardModel> forward;
  std::vector<std::string> inputs;  ///< files read, absolute

  const std::vector<PartLeftOut>& parts_of(std::size_t contrast) const;
};

/// Reads the averages of all conditions, edits and checks channels, estimates the noise, forms the
/// contrasts. `counts`: of the experiment. Throws InputError.
ParticipantData load_participant(const Experiment& experiment, const std::string& participant,
                                 const TrialCounts& counts, ForwardModels& forward_models);

/// The mean: averages and contrasts over the channels that more than half of the participants have
/// (a lead that one lacks is interpolated there by the spline through the leads it has), noise
/// propagated, electrodes at their mean positions. Of at least one participant.
ParticipantData mean_participant(const Experiment& experiment,
                                 const std::vector<const ParticipantData*>& participants,
                                 ForwardModels& forward_models);

TrialCounts read_counts(const Experiment& experiment);

}  // namespace headwater
