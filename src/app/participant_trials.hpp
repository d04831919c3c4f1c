// SPDX-License-Identifier: GPL-3.0-or-later
// From a participant's recording to averages, noise, contrasts and their blocks. The trials
// themselves are let go: memory is that of one participant's epochs at a time for each job.
#pragma once
#include <headwater/app/participant.hpp>

namespace headwater {

/// Fills all of `data` but the forward model; data.name and data.cap are there.
void load_trials(const Experiment& experiment, ParticipantData& data);

/// Adds a note where the whiteness check failed.
void note_whiteness(ParticipantData& data);

}  // namespace headwater
