// SPDX-License-Identifier: GPL-3.0-or-later
// Writes EDF+C through EDFlib, for recordings that we invent (the example, tests).
#pragma once
#include <headwater/base/edf.hpp>
#include <headwater/base/labels.hpp>

#include <Eigen/Core>

#include <filesystem>
#include <vector>

namespace headwater {

/// data_uV: #channels by #samples, a whole number of 1-s records at a whole sampling rate in Hz.
/// Every channel gets the same physical range: the largest magnitude, rounded up to a whole uV; so
/// the step is range / 32767. The header's person is anonymous and its date fixed, so that the same
/// data give the same bytes. Written under a temporary name, then renamed.
void write_edf(const std::filesystem::path& path, const Labels& channels, int sampling_Hz,
               const Eigen::MatrixXd& data_uV, const std::vector<EdfAnnotation>& annotations);

}  // namespace headwater
