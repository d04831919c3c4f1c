// SPDX-License-Identifier: GPL-3.0-or-later
// Reading and epoching: 64 channels at 500 Hz for 100 s, cut into 600-ms epochs of all channels, V.
// Beside it the least that any reader must do: the same bytes of the file, in memory, to double in
// the order in which they lie. bytes_per_second counts bytes of EDF.
#include "quiet_memory.hpp"

#include <headwater/base/atomic_file.hpp>
#include <headwater/base/edf_writing.hpp>
#include <headwater/base/random.hpp>
#include <headwater/signal/recording.hpp>

#include <Eigen/Core>
#include <benchmark/benchmark.h>
#include <unistd.h>

#include <cstdint>
#include <cstring>
#include <filesystem>
#include <string>
#include <vector>

namespace {

constexpr Eigen::Index kChannels = 64, kSamples = 50'000, kEpoch = 300;

/// The file, removed when the benchmarks end.
struct Invented {
  std::filesystem::path folder = std::filesystem::temp_directory_path() /
                                 ("headwater-recording-bench-" + std::to_string(::getpid()));
  std::filesystem::path edf = folder / "a_eeg.edf";
  Invented() {
    headwater::RandomStream random(1, "recording bench");
    headwater::Labels names;
    for (Eigen::Index i = 0; i < kChannels; ++i) names.push_back("E" + std::to_string(i + 1));
    headwater::write_edf(edf, names, 500, 20 * random.normal_matrix(kChannels, kSamples), {});
  }
  ~Invented() {
    std::error_code ignored;
    std::filesystem::remove_all(folder, ignored);
  }
};

const Invented& invented() {
  static const Invented file;
  return file;
}

/// Every epoch of the recording, one after another in the same memory.
void read_epochs(const headwater::Recording& recording, Eigen::MatrixXd& epoch_V) {
  for (Eigen::Index first = 0; first + kEpoch <= kSamples; first += kEpoch) {
    for (Eigen::Index c = 0; c < kChannels; ++c)
      recording.read(static_cast<std::size_t>(c), first, kEpoch, &epoch_V(c, 0), kChannels);
    benchmark::DoNotOptimize(epoch_V.data());
    benchmark::ClobberMemory();
  }
}

void set_edf_bytes(benchmark::State& state) {
  state.SetBytesProcessed(state.iterations() * (kSamples / kEpoch) * kEpoch * kChannels * 2);
}

void open_and_read_epochs(benchmark::State& state) {
  invented();
  Eigen::MatrixXd epoch_V(kChannels, kEpoch);
  for (auto _ : state) read_epochs(headwater::Recording(invented().edf), epoch_V);
  set_edf_bytes(state);
}

void read_epochs_alone(benchmark::State& state) {
  const headwater::Recording recording(invented().edf);
  Eigen::MatrixXd epoch_V(kChannels, kEpoch);
  for (auto _ : state) read_epochs(recording, epoch_V);
  set_edf_bytes(state);
}

void bare_conversion(benchmark::State& state) {
  const std::string bytes = headwater::read_file(invented().edf, "recording");
  constexpr std::size_t kPiece = kEpoch * kChannels;
  std::vector<double> values(kPiece);
  const std::size_t pieces = bytes.size() / (2 * kPiece);
  for (auto _ : state)
    for (std::size_t p = 0; p < pieces; ++p) {
      for (std::size_t i = 0; i < kPiece; ++i) {
        std::int16_t digital;
        std::memcpy(&digital, bytes.data() + 2 * (p * kPiece + i), 2);
        values[i] = 3e-9 * digital;
      }
      benchmark::DoNotOptimize(values.data());
      benchmark::ClobberMemory();
    }
  state.SetBytesProcessed(state.iterations() * static_cast<std::int64_t>(pieces * 2 * kPiece));
}

BENCHMARK(open_and_read_epochs)->Unit(benchmark::kMillisecond);
BENCHMARK(read_epochs_alone)->Unit(benchmark::kMillisecond);
BENCHMARK(bare_conversion)->Unit(benchmark::kMillisecond);

}  // namespace
