// SPDX-License-Identifier: GPL-3.0-or-later
// Pictures out of a results folder: one PNG for each contrast, method and window of a participant
// (by default of the mean), drawn from the files that `locate` wrote, so that they show what is
// there.
#pragma once
#include <headwater/app/stages.hpp>

#include <filesystem>
#include <vector>

namespace headwater {

/// Writes results/figures/<participant>_contrast-..._method-..._window-....png; returns the paths.
/// Throws InputError where results are missing (says to run `headwater locate` first) or hold no
/// maps (the user's own points), ResourceError where no renderer can be had.
std::vector<std::filesystem::path> draw_figures(const Experiment& experiment,
                                                const StageOptions& options);

}  // namespace headwater
