// SPDX-License-Identifier: GPL-3.0-or-later
// The invented example's single trials: a BIDS folder of EDF+ recordings with events, channels,
// digitised electrodes, and the truth behind them.
//
// Recording of a person: H [ sum over beats i and sources s of L(r_s) q_s m_s,i g_s(t - t_i) + b(t)
// + e(t) ], with m the N1's constant or the mismatch's m0 + m1 (surprise_i - its mean), and the
// background b made of stretches of two seconds, each an independent trial of example_noise.hpp,
// faded into one another with weights of constant power.
#pragma once
#include "example_person.hpp"

#include <cstdint>
#include <filesystem>
#include <vector>

namespace headwater {

/// Writes recordings/ and truth_recordings.tsv into the example's folder.
void write_example_recordings(const std::filesystem::path& folder, const ExampleRecipe& recipe,
                              const std::vector<ExamplePerson>& people, std::uint64_t seed);

}  // namespace headwater
