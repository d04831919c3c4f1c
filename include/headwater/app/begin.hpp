// SPDX-License-Identifier: GPL-3.0-or-later
// A first experiment file for a BIDS folder: filled from what is there, commented, ready to be
// edited.
#pragma once
#include <filesystem>
#include <string>

namespace headwater {

struct BegunExperiment {
  std::string text;     ///< the experiment file
  std::string summary;  ///< what was found, for a terminal
};

/// Looks for EDF recordings below the folder (the most frequent name pattern sub-*_..._eeg.edf, or
/// any .edf whose name or folder begins with sub-), reads the first participant's side files and
/// the events of all. `file`: where the experiment file will stand, so that paths can be relative
/// to it. Throws InputError: no such folder, no recording in it (says what was looked for), no
/// events.
BegunExperiment begin_experiment(const std::filesystem::path& folder,
                                 const std::filesystem::path& file);

}  // namespace headwater
