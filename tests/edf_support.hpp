// SPDX-License-Identifier: GPL-3.0-or-later
// EDF files made byte by byte, right or wrong in any field.
#pragma once
#include <headwater/base/atomic_file.hpp>

#include <cstdint>
#include <filesystem>
#include <optional>
#include <string>
#include <vector>

namespace headwater {

/// A field of `width` bytes: cut, or padded with blanks.
inline std::string edf_field(std::string text, std::size_t width) {
  text.resize(width, ' ');
  return text;
}

/// 16-bit samples, least significant byte first.
inline std::string edf_samples(const std::vector<int>& values) {
  std::string bytes;
  for (const int value : values) {
    bytes += static_cast<char>(value & 0xff);
    bytes += static_cast<char>((value >> 8) & 0xff);
  }
  return bytes;
}

struct MadeSignal {
  std::string label = "Cz", unit = "uV", physical_min = "-100", physical_max = "100",
              digital_min = "-32768", digital_max = "32767", samples = "4";
};

/// Zero bytes fill what a record's annotations leave.
inline std::string annotation_block(std::string lists, std::size_t bytes) {
  lists.resize(bytes, '\0');
  return lists;
}

struct MadeEdf {
  std::string version = "0", reserved, duration = "1";
  std::optional<std::string> header_bytes, records, signal_count;  ///< what is true unless set
  std::vector<MadeSignal> signals = {MadeSignal{}};
  std::vector<std::string> data = {edf_samples({1, 2, 3, 4})};  ///< of each record

  std::string bytes() const {
    const std::size_t n = signals.size();
    std::string b =
        edf_field(version, 8) + edf_field("X X X X", 80) + edf_field("Startdate X X X X", 80) +
        edf_field("01.01.00", 8) + edf_field("00.00.00", 8) +
        edf_field(header_bytes.value_or(std::to_string(256 * (n + 1))), 8) +
        edf_field(reserved, 44) + edf_field(records.value_or(std::to_string(data.size())), 8) +
        edf_field(duration, 8) + edf_field(signal_count.value_or(std::to_string(n)), 4);
    const auto all = [&](std::string MadeSignal::*member, std::size_t width) {
      for (const auto& signal : signals) b += edf_field(signal.*member, width);
    };
    all(&MadeSignal::label, 16);
    b.append(80 * n, ' ');
    all(&MadeSignal::unit, 8);
    all(&MadeSignal::physical_min, 8);
    all(&MadeSignal::physical_max, 8);
    all(&MadeSignal::digital_min, 8);
    all(&MadeSignal::digital_max, 8);
    b.append(80 * n, ' ');
    all(&MadeSignal::samples, 8);
    b.append(32 * n, ' ');
    for (const auto& record : data) b += record;
    return b;
  }
  std::filesystem::path write(const std::filesystem::path& path) const {
    write_file(path, bytes());
    return path;
  }
};

inline MadeSignal annotation_signal(std::size_t bytes) {
  MadeSignal signal;
  signal.label = "EDF Annotations";
  signal.unit = "";
  signal.physical_min = "-1";
  signal.physical_max = "1";
  signal.samples = std::to_string(bytes / 2);
  return signal;
}

/// EDF+ of one channel of 4 samples a second, 0, 1, 2 ... in 0.1 uV steps; record r begins at
/// stamps[r] and holds lists[r] behind its time-stamp.
inline MadeEdf made_edf_plus(const std::string& kind, const std::vector<std::string>& stamps,
                             const std::vector<std::string>& lists = {}) {
  constexpr std::size_t kBytes = 80;
  MadeEdf edf;
  edf.reserved = kind;
  edf.signals = {MadeSignal{}, annotation_signal(kBytes)};
  edf.signals[0].physical_min = "-3276.8";
  edf.signals[0].physical_max = "3276.7";
  edf.data.clear();
  int next = 0;
  for (std::size_t r = 0; r < stamps.size(); ++r) {
    const std::string more = r < lists.size() ? lists[r] : "";
    edf.data.push_back(
        edf_samples({next, next + 1, next + 2, next + 3}) +
        annotation_block(stamps[r] + "\x14\x14" + std::string(1, '\0') + more, kBytes));
    next += 4;
  }
  return edf;
}

}  // namespace headwater
