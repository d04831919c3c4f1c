// SPDX-License-Identifier: GPL-3.0-or-later
// The tables of one located contrast, as values; results_folder.cpp writes them.
#pragma once
#include <headwater/app/results_folder.hpp>

namespace headwater {

OutputTable grid_table(const ForwardModel& forward);
OutputTable positions_table(const std::string& what, const Labels& names,
                            const Eigen::Matrix3Xd& head_m);
OutputTable dipole_table(const ForwardModel& forward, const ContrastWaveform& contrast,
                         const std::vector<WindowDipoles>& dipoles);
OutputTable peak_table(const ForwardModel& forward, const LocatedContrast& located,
                       const std::vector<WindowDipoles>& dipoles);
/// What was decided about a participant's data: leads, trials, regression, digitised cap.
OutputTable lead_table(const ParticipantData& participant);
OutputTable trial_table(const ParticipantData& participant);
OutputTable regression_table(const ParticipantData& participant);
Json cap_json(const ParticipantCap& cap);
OutputTable region_table(const ForwardModel& forward, const LocatedContrast& located);
OutputTable region_course_table(const ForwardModel& forward, const ContrastWaveform& contrast,
                                const LocatedContrast& located);
/// What becomes of the answer without each lead, block of trials or participant.
OutputTable influence_table(const ForwardModel& forward, const std::vector<WindowDipoles>& dipoles);
OutputTable influence_table(const ForwardModel& forward, const LocatedContrast& located);
OutputTable index_table(const LocatedContrast& located);
Json fit_json(const ParticipantData& participant, const ContrastWaveform& contrast,
              const LocatedContrast& located);
std::vector<SummaryRow> summarise(const ParticipantData& participant,
                                  const ContrastWaveform& contrast, const LocatedContrast& located,
                                  const std::vector<WindowDipoles>& dipoles);

}  // namespace headwater
