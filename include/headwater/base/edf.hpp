// SPDX-License-Identifier: GPL-3.0-or-later
// European Data Format recordings: EDF (Kemp et al. 1992 Electroenceph Clin Neurophysiol 82:391)
// and EDF+ (Kemp & Olivan 2003 Clin Neurophysiol 114:1755), continuous (EDF+C) and with gaps
// (EDF+D). The file is mapped, not loaded: memory is that of what is asked for.
//
//   physical = (digital - digital_min) (physical_max - physical_min) / (digital_max - digital_min)
//              + physical_min
// What identifies a person (patient, recording, start date) is never read out of the header.
#pragma once
#include <cstdint>
#include <filesystem>
#include <memory>
#include <string>
#include <vector>

namespace headwater {

struct EdfSignal {
  std::string label;  ///< as it stands in the header, blanks at its ends removed
  std::string unit;   ///< physical dimension, same; a micro sign in any encoding is UTF-8's
  double scale = 1;   ///< physical = scale * digital + offset
  double offset = 0;
  std::int64_t samples_per_record = 0;
};

/// An annotation of EDF+; onset in seconds of the time axis of record_onset_s.
struct EdfAnnotation {
  double onset_s = 0;
  double duration_s = 0;  ///< NaN: none given
  std::string text;
};

class EdfFile {
 public:
  enum class Kind { plain, continuous, discontinuous };

  /// Reads and checks the header, and of EDF+ every record's time-stamp and annotations. Errors
  /// (InputError), each with the file, the header field, what was found and what was expected:
  /// missing or not a regular file; shorter than its header; a header field that is no number or
  /// not printable ASCII; no signals; header length other than 256 (signals + 1); no records, or
  /// more or fewer than the file holds (-1, a recording that was not closed: the records there
  /// are); records of no duration with samples in them; no samples; physical minimum equal to the
  /// maximum, digital not below it or beyond 16 bits; EDF+ without annotations signal, or such a
  /// signal in plain EDF; a record without time-stamp, stamps that go back, stamps of EDF+C that
  /// leave gaps (half a sample is let pass as rounding); an annotation without onset. No allocation
  /// is larger than the file (8 bytes for each record's onset apart).
  explicit EdfFile(const std::filesystem::path& path);
  ~EdfFile();
  EdfFile(EdfFile&&) noexcept;
  EdfFile& operator=(EdfFile&&) noexcept;

  Kind kind() const;
  double record_duration_s() const;
  std::int64_t records() const;
  const std::vector<EdfSignal>& signals() const;  ///< without annotation signals
  /// Onset of each record, s after the first; #records.
  const std::vector<double>& record_onset_s() const;
  const std::vector<EdfAnnotation>& annotations() const;  ///< in order of onset

  /// `count` samples of a signal from sample `first` (counted over records, gaps not counted), in
  /// its physical unit times `factor`, to out[0], out[stride], ... Throws std::logic_error outside
  /// the file.
  void read(std::size_t signal, std::int64_t first, std::int64_t count, double factor, double* out,
            std::int64_t stride = 1) const;

 private:
  struct Mapped;
  std::unique_ptr<Mapped> mapped_;
};

}  // namespace headwater
