// SPDX-License-Identifier: GPL-3.0-or-later
// The header of an EDF file: where its numbers stand and how they are scaled.
#pragma once
#include <headwater/base/edf.hpp>

#include <cstdint>
#include <filesystem>
#include <string_view>
#include <vector>

namespace headwater {

struct EdfHeader {
  /// Place of a signal in each record.
  struct Place {
    std::int64_t first_byte = 0;
    std::int64_t samples = 0;
  };
  EdfFile::Kind kind = EdfFile::Kind::plain;
  std::int64_t bytes = 0;         ///< of the header
  std::int64_t record_bytes = 0;  ///< of each record
  std::int64_t records = 0;       ///< announced; -1: a recording that was not closed
  double record_duration_s = 0;
  std::vector<EdfSignal> signals;
  std::vector<Place> places;       ///< of `signals`
  std::vector<Place> annotations;  ///< of the annotation signals
};

/// `file`: all bytes of the file. Throws InputError as EdfFile says, except for what the records
/// themselves hold.
EdfHeader parse_edf_header(const std::filesystem::path& path, std::string_view file);

}  // namespace headwater
