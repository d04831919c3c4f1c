// SPDX-License-Identifier: GPL-3.0-or-later
// The header has 256 bytes for the file, then 256 for each signal, stored field by field: all
// labels, all transducers, and so on (Kemp et al. 1992, table 1). Fields are ASCII, padded with
// blanks; some writers pad with NULs instead, which is let pass.
#include "base/edf_header.hpp"

#include <headwater/base/error.hpp>

#include <fmt/core.h>

#include <charconv>
#include <cmath>
#include <string>

namespace headwater {
namespace {

constexpr std::size_t kBlock = 256;

struct Field {
  const char* name;
  std::size_t first, width;
};
constexpr Field kVersion{"version", 0, 8}, kHeaderBytes{"number of bytes in header", 184, 8},
    kReserved{"reserved", 192, 44}, kRecords{"number of data records", 236, 8},
    kDuration{"duration of a data record", 244, 8}, kSignals{"number of signals", 252, 4};
// Of a signal; `first` is the sum of the widths before it.
constexpr Field kLabel{"label", 0, 16}, kUnit{"physical dimension", 96, 8},
    kPhysicalMin{"physical minimum", 104, 8}, kPhysicalMax{"physical maximum", 112, 8},
    kDigitalMin{"digital minimum", 120, 8}, kDigitalMax{"digital maximum", 128, 8},
    kSamples{"number of samples in each data record", 216, 8};

std::string_view trimmed(std::string_view text) {
  const auto blank = [](char c) { return c == ' ' || c == '\0'; };
  while (!text.empty() && blank(text.front())) text.remove_prefix(1);
  while (!text.empty() && blank(text.back())) text.remove_suffix(1);
  return text;
}

std::string shown(std::string_view text) {
  std::string result;
  for (const char c : text)
    result += c >= 0x20 && c < 0x7f ? std::string(1, c)
                                    : fmt::format("\\x{:02x}", static_cast<unsigned char>(c));
  return "'" + result + "'";
}

bool is_printable(std::string_view text) {
  for (const char c : text)
    if (c < 0x20 || c >= 0x7f) return false;  // char is signed or not: both ends are tested
  return true;
}

/// The header's fields, of the file or of one signal, each checked as it is read.
class Fields {
 public:
  Fields(const std::filesystem::path& path, std::string_view header)
      : path_(path), header_(header) {}

  /// From now on fields are those of this signal.
  void select(std::size_t signal, std::size_t signals) {
    signal_ = signal;
    signals_ = signals;
    label_.clear();
    label_ = text(kLabel);
  }

  [[noreturn]] void refuse(const Field& field, std::string_view problem) const {
    throw InputError(fmt::format("{}: {}header field '{}': {}", path_.string(), signal_name(),
                                 field.name, problem));
  }
  [[noreturn]] void refuse_found(const Field& field, std::string_view expected) const {
    refuse(field, fmt::format("found {}, expected {}.", shown(trimmed(raw(field))), expected));
  }

  std::string_view raw(const Field& field) const {
    if (signals_ == 0) return header_.substr(field.first, field.width);
    return header_.substr(kBlock + field.first * signals_ + signal_ * field.width, field.width);
  }
  std::string text(const Field& field) const {
    const auto result = trimmed(raw(field));
    if (!is_printable(result)) refuse_found(field, "printable ASCII");
    return std::string(result);
  }
  std::int64_t integer(const Field& field, std::int64_t least, std::int64_t most,
                       std::string_view expected) const {
    std::int64_t value = 0;
    if (!parse(raw(field), value) || value < least || value > most) refuse_found(field, expected);
    return value;
  }
  double number(const Field& field) const {
    double value = 0;
    if (!parse(raw(field), value) || !std::isfinite(value)) refuse_found(field, "a number");
    return value;
  }

 private:
  template <typename T>
  static bool parse(std::string_view text, T& value) {
    text = trimmed(text);
    if (text.size() > 1 && text.front() == '+' && text[1] != '-') text.remove_prefix(1);
    const auto [end, error] = std::from_chars(text.data(), text.data() + text.size(), value);
    return error == std::errc() && end == text.data() + text.size();
  }
  std::string signal_name() const {
    if (signals_ == 0) return "";
    return fmt::format("signal {} of {} ({}), ", signal_ + 1, signals_, shown(label_));
  }

  const std::filesystem::path& path_;
  std::string_view header_;
  std::size_t signal_ = 0, signals_ = 0;
  std::string label_;
};

void check_version(const Fields& fields) {
  const auto version = fields.raw(kVersion);
  if (version.substr(1) == "BIOSEMI")
    fields.refuse(kVersion,
                  "this is a BDF file (24 bits a sample), expected EDF (16 bits). Convert it.");
  if (trimmed(version) != "0") fields.refuse_found(kVersion, "'0': an EDF file");
}

EdfFile::Kind kind_of(const Fields& fields) {
  const std::string_view text = trimmed(fields.raw(kReserved));
  if (text.substr(0, 5) == "EDF+C") return EdfFile::Kind::continuous;
  if (text.substr(0, 5) == "EDF+D") return EdfFile::Kind::discontinuous;
  if (text.substr(0, 4) == "EDF+") fields.refuse_found(kReserved, "'EDF+C', 'EDF+D' or neither");
  return EdfFile::Kind::plain;
}

/// The unit; the micro sign of Latin-1 or UTF-8, or a Greek mu, is let pass and becomes UTF-8's
/// micro sign.
std::string unit_of(const Fields& fields) {
  std::string_view rest = trimmed(fields.raw(kUnit));
  std::string micro;
  for (const std::string_view sign : {"\xc2\xb5", "\xce\xbc", "\xb5"})
    if (micro.empty() && rest.substr(0, sign.size()) == sign) {
      micro = "\xc2\xb5";
      rest.remove_prefix(sign.size());
    }
  if (!is_printable(rest)) fields.refuse_found(kUnit, "printable ASCII");
  return micro + std::string(rest);
}

/// Scale and offset such that physical = scale digital + offset. Of a range that is symmetric about
/// zero the offset is exactly zero.
void set_scale(const Fields& fields, EdfSignal& signal) {
  constexpr std::string_view k16Bits = "a whole number from -32768 to 32767";
  const auto digital_min = fields.integer(kDigitalMin, -32768, 32767, k16Bits);
  const auto digital_max = fields.integer(kDigitalMax, -32768, 32767, k16Bits);
  if (digital_max <= digital_min)
    fields.refuse(kDigitalMax, fmt::format("found {}, expected more than the digital minimum {}.",
                                           digital_max, digital_min));
  const double physical_min = fields.number(kPhysicalMin);
  const double physical_max = fields.number(kPhysicalMax);
  if (physical_min == physical_max)
    fields.refuse(kPhysicalMax,
                  fmt::format("found {}, the same as the physical minimum: the values have no "
                              "scale.",
                              physical_max));
  const double steps = static_cast<double>(digital_max - digital_min);
  signal.scale = (physical_max - physical_min) / steps;
  signal.offset = (physical_min * static_cast<double>(digital_max) -
                   physical_max * static_cast<double>(digital_min)) /
                  steps;
  if (!std::isfinite(signal.scale) || !std::isfinite(signal.offset))
    fields.refuse(kPhysicalMax, "the physical range is too large for any computation.");
}

void parse_signal(const Fields& fields, EdfHeader& header) {
  EdfSignal signal;
  signal.label = fields.text(kLabel);
  signal.samples_per_record =
      fields.integer(kSamples, 1, 99'999'999, "a whole number of samples, 1 or more");
  const EdfHeader::Place place{header.record_bytes, signal.samples_per_record};
  header.record_bytes += 2 * place.samples;
  if (signal.label == "EDF Annotations") {
    // Its bytes are text: ranges and unit mean nothing, and many writers fill them freely.
    if (header.kind == EdfFile::Kind::plain)
      fields.refuse(kLabel,
                    "a signal of annotations in a file whose field 'reserved' says neither 'EDF+C' "
                    "nor 'EDF+D': whether its records follow each other without gaps is unknown.");
    header.annotations.push_back(place);
    return;
  }
  signal.unit = unit_of(fields);
  set_scale(fields, signal);
  header.signals.push_back(signal);
  header.places.push_back(place);
}

}  // namespace

EdfHeader parse_edf_header(const std::filesystem::path& path, std::string_view file) {
  if (file.size() < kBlock)
    throw InputError(fmt::format("{}: holds {} bytes; an EDF header has at least {}.",
                                 path.string(), file.size(), kBlock));
  const Fields fields(path, file);
  check_version(fields);
  EdfHeader header;
  header.kind = kind_of(fields);
  const auto count = fields.integer(kSignals, 1, 9999, "a whole number of signals, 1 or more");
  const auto signals = static_cast<std::size_t>(count);
  header.bytes = static_cast<std::int64_t>(kBlock) * (count + 1);
  const std::string expected = fmt::format(
      "{}: 256 bytes for the file and 256 for each of {} "
      "signals",
      header.bytes, count);
  fields.integer(kHeaderBytes, header.bytes, header.bytes, expected);
  if (file.size() < static_cast<std::size_t>(header.bytes))
    throw InputError(
        fmt::format("{}: holds {} bytes, but its header alone should have {}: the "
                    "file is cut short, or its number of signals ({}) is wrong.",
                    path.string(), file.size(), header.bytes, count));
  header.records = fields.integer(kRecords, -1, 99'999'999,
                                  "a whole number of records, 1 or more (-1: not closed)");
  if (header.records == 0) fields.refuse_found(kRecords, "1 or more: the recording is empty");
  header.record_duration_s = fields.number(kDuration);
  if (header.record_duration_s < 0) fields.refuse_found(kDuration, "a number of seconds above 0");

  for (std::size_t signal = 0; signal < signals; ++signal) {
    Fields of_signal(path, file);
    of_signal.select(signal, signals);
    parse_signal(of_signal, header);
  }
  if (header.signals.empty())
    fields.refuse(kSignals, "no signals but annotations: there are no samples.");
  if (header.record_duration_s == 0)
    fields.refuse(kDuration, "found 0, although records hold samples; expected seconds above 0.");
  // Rates are samples / duration: a duration next to nothing would make them infinite.
  for (const EdfSignal& signal : header.signals)
    if (!std::isfinite(static_cast<double>(signal.samples_per_record) / header.record_duration_s))
      fields.refuse_found(kDuration, "seconds enough for the record's samples");
  if (header.kind != EdfFile::Kind::plain && header.annotations.empty())
    fields.refuse(
        kReserved,
        "says EDF+, but there is no signal 'EDF Annotations' to hold the records' times.");
  return header;
}

}  // namespace headwater
