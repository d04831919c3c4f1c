// SPDX-License-Identifier: GPL-3.0-or-later
// Time-stamped annotation lists: the text in the annotation signals of EDF+.
#pragma once
#include <headwater/base/edf.hpp>

#include <optional>
#include <string>
#include <string_view>
#include <vector>

namespace headwater {

/// Annotations of one record's block of an annotation signal; onsets as they stand there.
struct EdfAnnotationBlock {
  std::optional<double> stamp_s;  ///< when the first list is time-keeping: its onset
  std::vector<EdfAnnotation> annotations;
};

/// `where` begins each message ("file: record 3 of 7"). `keeps_time`: the block is of the first
/// annotation signal, whose first list times the record. Throws InputError.
EdfAnnotationBlock parse_edf_annotations(std::string_view block, bool keeps_time,
                                         const std::string& where);

}  // namespace headwater
