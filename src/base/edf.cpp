// SPDX-License-Identifier: GPL-3.0-or-later
// Our own reader, because the library that writes EDF for us refuses files with gaps (EDF+D) and
// real EDF+ files whose annotation signals carry a prefilter text. Samples are 16-bit two's
// complement, least significant byte first, record after record, in each record signal after
// signal.
//
// Time. Stamps of EDF+ count from the start time of the header, and the first may lie a fraction of
// a second after it; everything here counts from the first record instead, as BIDS events do: the
// first stamp is subtracted from those of records and annotations.
#include "base/edf_annotations.hpp"
#include "base/edf_header.hpp"

#include <headwater/base/edf.hpp>
#include <headwater/base/error.hpp>

#include <fcntl.h>
#include <fmt/core.h>
#include <sys/mman.h>
#include <sys/stat.h>
#include <unistd.h>

#include <algorithm>
#include <cerrno>
#include <iterator>
#include <stdexcept>
#include <string_view>
#include <system_error>
#include <utility>

namespace headwater {
namespace {

/// The bytes of a file, read by the system as they are touched.
class Map {
 public:
  explicit Map(const std::filesystem::path& path) {
    const auto refuse = [&](int error) {
      throw InputError(fmt::format("{}: the recording cannot be read: {}.", path.string(),
                                   std::generic_category().message(error)));
    };
    const int file = ::open(path.c_str(), O_RDONLY | O_CLOEXEC | O_NONBLOCK);
    if (file < 0) refuse(errno);
    struct stat status {};
    const bool known = ::fstat(file, &status) == 0;
    int error = known ? 0 : errno;
    if (known && S_ISDIR(status.st_mode)) error = EISDIR;
    const bool regular = known && S_ISREG(status.st_mode);
    if (regular && status.st_size > 0) {
      size_ = static_cast<std::size_t>(status.st_size);
      bytes_ = ::mmap(nullptr, size_, PROT_READ, MAP_PRIVATE, file, 0);
      if (bytes_ == MAP_FAILED) error = errno;
    }
    ::close(file);
    if (error != 0) refuse(error);
    if (!regular)
      throw InputError(path.string() + ": the recording is not a regular file, expected EDF.");
  }
  ~Map() {
    if (size_ > 0) ::munmap(bytes_, size_);
  }
  Map(const Map&) = delete;
  Map& operator=(const Map&) = delete;
  std::string_view bytes() const {
    return size_ > 0 ? std::string_view(static_cast<const char*>(bytes_), size_)
                     : std::string_view();
  }

 private:
  void* bytes_ = nullptr;
  std::size_t size_ = 0;
};

/// How many records the file holds. Compared by division: the announced number of bytes may not fit
/// 64 bits.
std::int64_t count_records(const std::filesystem::path& path, const EdfHeader& header,
                           std::int64_t data_bytes) {
  const std::int64_t whole = data_bytes / header.record_bytes;
  const std::int64_t left = data_bytes % header.record_bytes;
  if (header.records >= 0 && (whole != header.records || left != 0)) {
    const std::string part = left ? fmt::format(" and {} bytes of a further one", left) : "";
    throw InputError(fmt::format(
        "{}: header field 'number of data records': {} announced, but the file holds {} whole "
        "records of {} bytes{}. {}",
        path.string(), header.records, whole, header.record_bytes, part,
        whole < header.records ? "The file is cut short, or its header is wrong."
                               : "The header is wrong, or something follows the recording."));
  }
  if (whole == 0)
    throw InputError(
        fmt::format("{}: header field 'number of data records': -1 (not closed), and the file "
                    "holds no whole record of {} bytes: the recording is empty.",
                    path.string(), header.record_bytes));
  return whole;
}

inline double sample_at(const char* bytes) {
  const auto low = static_cast<unsigned char>(bytes[0]);
  const auto high = static_cast<unsigned char>(bytes[1]);
  return static_cast<double>(static_cast<std::int16_t>(low | (high << 8)));
}

/// out[i stride] = scale digital + offset.
void convert(const char* from, std::int64_t count, double scale, double offset, double* out,
             std::int64_t stride) {
  if (stride == 1) {
    for (std::int64_t i = 0; i < count; ++i) out[i] = scale * sample_at(from + 2 * i) + offset;
    return;
  }
  for (std::int64_t i = 0; i < count; ++i)
    out[i * stride] = scale * sample_at(from + 2 * i) + offset;
}

}  // namespace

struct EdfFile::Mapped {
  explicit Mapped(const std::filesystem::path& path)
      : map(path), header(parse_edf_header(path, map.bytes())) {
    const auto size = static_cast<std::int64_t>(map.bytes().size());
    records = count_records(path, header, size - header.bytes);
    if (header.kind == Kind::plain) {
      onset_s.reserve(static_cast<std::size_t>(records));
      for (std::int64_t r = 0; r < records; ++r)
        onset_s.push_back(static_cast<double>(r) * header.record_duration_s);
    } else {
      read_annotations(path);
      check_stamps(path);
    }
  }

  const char* record(std::int64_t r) const {
    return map.bytes().data() + header.bytes + r * header.record_bytes;
  }

  void read_annotations(const std::filesystem::path& path) {
    onset_s.reserve(static_cast<std::size_t>(records));
    for (std::int64_t r = 0; r < records; ++r) {
      const std::string where = fmt::format("{}: record {} of {}", path.string(), r + 1, records);
      for (std::size_t k = 0; k < header.annotations.size(); ++k) {
        const auto& place = header.annotations[k];
        const std::string_view block(record(r) + place.first_byte,
                                     static_cast<std::size_t>(2 * place.samples));
        auto parsed = parse_edf_annotations(block, k == 0, where);
        if (k == 0 && !parsed.stamp_s)
          throw InputError(where +
                           " has no time-stamp: its first annotation signal begins with no "
                           "list whose first text is empty.");
        if (k == 0) onset_s.push_back(*parsed.stamp_s);
        std::move(parsed.annotations.begin(), parsed.annotations.end(),
                  std::back_inserter(annotations));
      }
    }
    const double first = onset_s.front();
    for (double& onset : onset_s) onset -= first;
    for (auto& annotation : annotations) annotation.onset_s -= first;
    std::stable_sort(annotations.begin(), annotations.end(),
                     [](const auto& a, const auto& b) { return a.onset_s < b.onset_s; });
  }

  /// Half a sample of the fastest signal tells a gap from rounding of the stamps.
  void check_stamps(const std::filesystem::path& path) const {
    std::int64_t most = 1;
    for (const auto& signal : header.signals) most = std::max(most, signal.samples_per_record);
    const double duration = header.record_duration_s;
    const double tolerance = 0.5 * duration / static_cast<double>(most);
    for (std::size_t r = 1; r < onset_s.size(); ++r) {
      const double step = onset_s[r] - onset_s[r - 1];
      const auto refuse = [&](const char* problem) {
        throw InputError(
            fmt::format("{}: record {} of {} begins {} s after the one before it, "
                        "which lasts {} s: {}",
                        path.string(), r + 1, records, step, duration, problem));
      };
      if (step < duration - tolerance) refuse("the time-stamps go back.");
      if (header.kind == Kind::continuous && step > duration + tolerance)
        refuse("a gap, although the header's field 'reserved' says EDF+C, continuous.");
    }
  }

  Map map;
  EdfHeader header;
  std::int64_t records = 0;
  std::vector<double> onset_s;
  std::vector<EdfAnnotation> annotations;
};

EdfFile::EdfFile(const std::filesystem::path& path) : mapped_(std::make_unique<Mapped>(path)) {}
EdfFile::~EdfFile() = default;
EdfFile::EdfFile(EdfFile&&) noexcept = default;
EdfFile& EdfFile::operator=(EdfFile&&) noexcept = default;

EdfFile::Kind EdfFile::kind() const {
  return mapped_->header.kind;
}
double EdfFile::record_duration_s() const {
  return mapped_->header.record_duration_s;
}
std::int64_t EdfFile::records() const {
  return mapped_->records;
}
const std::vector<EdfSignal>& EdfFile::signals() const {
  return mapped_->header.signals;
}
const std::vector<double>& EdfFile::record_onset_s() const {
  return mapped_->onset_s;
}
const std::vector<EdfAnnotation>& EdfFile::annotations() const {
  return mapped_->annotations;
}

void EdfFile::read(std::size_t signal, std::int64_t first, std::int64_t count, double factor,
                   double* out, std::int64_t stride) const {
  const EdfSignal& scaling = signals().at(signal);
  const EdfHeader::Place& place = mapped_->header.places[signal];
  if (first < 0 || count < 0 || first > place.samples * records() - count)
    throw std::logic_error("EdfFile::read outside the file");
  const double scale = factor * scaling.scale, offset = factor * scaling.offset;
  while (count > 0) {
    const std::int64_t within = first % place.samples;
    const std::int64_t now = std::min(count, place.samples - within);
    convert(mapped_->record(first / place.samples) + place.first_byte + 2 * within, now, scale,
            offset, out, stride);
    out += now * stride;
    first += now;
    count -= now;
  }
}

}  // namespace headwater
