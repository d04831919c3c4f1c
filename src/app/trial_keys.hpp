// SPDX-License-Identifier: GPL-3.0-or-later
// The sections of the experiment file about recordings: [trials], [leads], [observer],
// [regression], and the events of each condition.
#pragma once
#include "app/key_reader.hpp"

#include <headwater/app/experiment_file.hpp>

#include <filesystem>

namespace headwater {

/// Conditions must have been read. folder: of the experiment file.
void read_trial_keys(KeyReader& keys, Experiment& experiment, const std::filesystem::path& folder);

}  // namespace headwater
