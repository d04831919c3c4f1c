// SPDX-License-Identifier: GPL-3.0-or-later
// What a recording's channels are: the EDF header's signals and the rows of _channels.tsv, joined
// by name.
#pragma once
#include <headwater/base/edf.hpp>
#include <headwater/base/labels.hpp>
#include <headwater/base/table.hpp>
#include <headwater/signal/recording.hpp>

#include <optional>
#include <string>
#include <vector>

namespace headwater {

/// Relative difference of sampling rates that rounding may explain: a record of EDF states its
/// duration in 8 characters.
inline constexpr double kRateTolerance = 1e-5;

/// Volts of a unit in any spelling; nothing: not a unit of voltage.
std::optional<double> volts_per_unit(std::string_view unit);

/// Channels in the order of the file's signals, set aside where Recording says so. `table`:
/// _channels.tsv or null. Throws InputError with all that is wrong.
std::vector<RecordingChannel> describe_channels(const std::string& source, const EdfFile& edf,
                                                const Table* table, Labels& notes);

/// Sets aside EEG channels that are not sampled at the rate of most, and returns that rate; 0 when
/// there is no EEG channel.
double set_aside_other_rates(std::vector<RecordingChannel>& channels);

}  // namespace headwater
