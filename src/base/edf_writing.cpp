// SPDX-License-Identifier: GPL-3.0-or-later
// EDFlib counts open files in a global table, so that writing is one at a time; it looks at no
// error of the disk while it writes samples, so that the file is read back at the end.
#include <headwater/base/edf_writing.hpp>
#include <headwater/base/error.hpp>

#include <edflib.h>
#include <fcntl.h>
#include <fmt/core.h>
#include <unistd.h>

#include <algorithm>
#include <cmath>
#include <mutex>
#include <stdexcept>
#include <string>
#include <system_error>

namespace headwater {
namespace {

constexpr int kDigitalMax = 32767;  // and its negative, so that 0 uV is stored exactly
constexpr std::size_t kLongestLabel = 16, kLongestText = 40;  // of EDF, and of EDFlib
constexpr int kMostAnnotationSignals = 64;

[[noreturn]] void fail(const std::filesystem::path& path, const std::string& reason) {
  throw ResourceError(fmt::format(
      "{}: cannot be written: {}. Check that the folder may be written to and that the disk has "
      "room.",
      path.string(), reason));
}

void check(const Labels& channels, int sampling_Hz, const Eigen::MatrixXd& data_uV,
           const std::vector<EdfAnnotation>& annotations) {
  const auto require = [](bool holds, const char* what) {
    if (!holds) throw std::logic_error(std::string("write_edf: ") + what);
  };
  require(!channels.empty() && channels.size() <= EDFLIB_MAXSIGNALS - kMostAnnotationSignals,
          "1 to 576 channels are expected");
  require(data_uV.rows() == static_cast<Eigen::Index>(channels.size()), "one name for each row");
  require(sampling_Hz > 0 && data_uV.cols() > 0 && data_uV.cols() % sampling_Hz == 0,
          "a whole number of seconds is expected");
  require(data_uV.allFinite() && data_uV.cwiseAbs().maxCoeff() <= 9'999'999,
          "finite data of less than 10 V are expected");
  const auto printable = [](char c) { return c >= 0x20 && c < 0x7f; };
  const auto control = [](char c) { return (c >= 0 && c < 0x20) || c == 0x7f; };
  for (const auto& name : channels)
    require(!name.empty() && name.size() <= kLongestLabel &&
                std::all_of(name.begin(), name.end(), printable),
            "names of 1 to 16 ASCII characters are expected");
  const auto records = static_cast<std::size_t>(data_uV.cols() / sampling_Hz);
  require(annotations.size() <= kMostAnnotationSignals * records,
          "at most 64 annotations a second");
  for (const auto& annotation : annotations)
    require(annotation.onset_s >= 0 && !(annotation.duration_s < 0) && !annotation.text.empty() &&
                annotation.text.size() <= kLongestText &&
                std::none_of(annotation.text.begin(), annotation.text.end(), control),
            "annotations have an onset, and a text of 1 to 40 bytes without control characters");
}

/// A file that EDFlib writes under a temporary name.
class Writer {
 public:
  Writer(const std::filesystem::path& path, int signals) : path_(path), temporary_(path) {
    temporary_.replace_filename(fmt::format(".headwater-{}.edf.part", ::getpid()));
    handle_ = edfopen_file_writeonly(temporary_.c_str(), EDFLIB_FILETYPE_EDFPLUS, signals);
    if (handle_ < 0)
      fail(path_, handle_ == EDFLIB_NO_SUCH_FILE_OR_DIRECTORY
                      ? "the file cannot be made"
                      : fmt::format("EDFlib returns {}", handle_));
  }
  ~Writer() {
    if (handle_ >= 0) edfclose_file(handle_);
    std::error_code ignored;
    if (!temporary_.empty()) std::filesystem::remove(temporary_, ignored);
  }
  Writer(const Writer&) = delete;
  Writer& operator=(const Writer&) = delete;
  int handle() const { return handle_; }
  void require(int outcome) const {
    if (outcome != 0) fail(path_, "EDFlib reports a failure");
  }
  /// Closes the file, reads it back far enough to see that all of it is there, and names it.
  void finish(std::int64_t records, std::size_t annotations) {
    const int outcome = edfclose_file(handle_);
    handle_ = -1;
    require(outcome);
    try {
      const EdfFile written(temporary_);
      if (written.records() != records || written.annotations().size() != annotations)
        fail(path_, "records or annotations were lost");
    } catch (const InputError& error) {
      fail(path_, fmt::format("it is not whole ({})", error.what()));
    }
    std::error_code error;
    const int file = ::open(temporary_.c_str(), O_RDONLY | O_CLOEXEC);
    const bool safe = file >= 0 && ::fsync(file) == 0;
    if (file >= 0) ::close(file);
    if (!safe) fail(path_, "it did not reach the disk");
    std::filesystem::rename(temporary_, path_, error);
    if (error) fail(path_, error.message());
    temporary_.clear();
  }

 private:
  std::filesystem::path path_, temporary_;
  int handle_ = -1;
};

void write_header(const Writer& writer, const Labels& channels, int sampling_Hz, double range_uV,
                  int annotation_signals) {
  const int handle = writer.handle();
  for (int i = 0; i < static_cast<int>(channels.size()); ++i) {
    writer.require(edf_set_label(handle, i, channels[static_cast<std::size_t>(i)].c_str()));
    writer.require(edf_set_samplefrequency(handle, i, sampling_Hz));
    writer.require(edf_set_physical_dimension(handle, i, "uV"));
    writer.require(edf_set_physical_maximum(handle, i, range_uV));
    writer.require(edf_set_physical_minimum(handle, i, -range_uV));
    writer.require(edf_set_digital_maximum(handle, i, kDigitalMax));
    writer.require(edf_set_digital_minimum(handle, i, -kDigitalMax));
  }
  writer.require(edf_set_startdatetime(handle, 2000, 1, 1, 0, 0, 0));
  writer.require(edf_set_equipment(handle, "invented"));
  writer.require(edf_set_number_of_annotation_signals(handle, annotation_signals));
}

void write_samples(const Writer& writer, int sampling_Hz, double range_uV,
                   const Eigen::MatrixXd& data_uV) {
  std::vector<short> record(static_cast<std::size_t>(sampling_Hz));
  for (Eigen::Index first = 0; first < data_uV.cols(); first += sampling_Hz)
    for (Eigen::Index channel = 0; channel < data_uV.rows(); ++channel) {
      for (int i = 0; i < sampling_Hz; ++i)
        record[static_cast<std::size_t>(i)] =
            static_cast<short>(std::lround(data_uV(channel, first + i) / range_uV * kDigitalMax));
      writer.require(edfwrite_digital_short_samples(writer.handle(), record.data()));
    }
}

void write_annotations(const Writer& writer, const std::vector<EdfAnnotation>& annotations) {
  constexpr double kTicks = 1e4;  // a second has 10 000 of EDFlib's units
  for (const auto& annotation : annotations) {
    const long long onset = std::llround(kTicks * annotation.onset_s);
    const long long duration =
        std::isnan(annotation.duration_s) ? -1 : std::llround(kTicks * annotation.duration_s);
    writer.require(
        edfwrite_annotation_utf8(writer.handle(), onset, duration, annotation.text.c_str()));
  }
}

}  // namespace

void write_edf(const std::filesystem::path& path, const Labels& channels, int sampling_Hz,
               const Eigen::MatrixXd& data_uV, const std::vector<EdfAnnotation>& annotations) {
  check(channels, sampling_Hz, data_uV, annotations);
  static std::mutex one_at_a_time;
  const std::scoped_lock lock(one_at_a_time);
  const auto folder = path.has_parent_path() ? path.parent_path() : std::filesystem::path(".");
  std::error_code error;
  std::filesystem::create_directories(folder, error);
  if (error) fail(path, error.message());

  const auto signals = data_uV.rows();
  const auto records = data_uV.cols() / sampling_Hz;
  const auto count = static_cast<Eigen::Index>(annotations.size());
  const auto annotation_signals = std::max<Eigen::Index>(1, (count + records - 1) / records);
  const double range_uV = std::max(1.0, std::ceil(data_uV.cwiseAbs().maxCoeff()));
  Writer writer(path, static_cast<int>(signals));
  write_header(writer, channels, sampling_Hz, range_uV, static_cast<int>(annotation_signals));
  write_samples(writer, sampling_Hz, range_uV, data_uV);
  write_annotations(writer, annotations);
  writer.finish(records, annotations.size());
}

}  // namespace headwater
