// SPDX-License-Identifier: GPL-3.0-or-later
// The invented example experiment: averages of people who do not exist, with sources that we
// placed, so that what the program finds can be held against the truth.
//
// A person's average of n trials, at leads against the recording reference H:
//   d(t) = H [ sum_s L(r_s, person) q_s m_s g_s(t) + (b(t) + e(t)) / sqrt(n) ] - its baseline mean
// with L the lead field of the person's own head, skull and electrodes at the person's own place
// r_s of source s (MNI space, mapped as the grid is), unit direction q_s (head frame), strength m_s
// in the condition (A m), g_s a Gaussian in time, b the background of a trial (cortical patches
// with 1/f and alpha spectra), e the sensors' white noise. The mean of n independent Gaussian
// trials is one such trial over sqrt(n): b and e are drawn once for each average. Sources and
// people: templates/example.toml.
#pragma once
#include <cstdint>
#include <filesystem>

namespace headwater {

/// Writes the example experiment to a folder (created; one that is not empty is refused:
/// ExperimentError): experiment.toml, README.md, participants.tsv, averages/, and the truth -
/// truth.tsv, truth_participants.tsv, truth_heads.tsv; and single trials: recordings.toml,
/// recordings/ (a BIDS folder), truth_recordings.tsv. The same seed gives the same bytes.
void write_example(const std::filesystem::path& folder, std::uint64_t seed);

}  // namespace headwater
