// SPDX-License-Identifier: GPL-3.0-or-later
// The inheritance principle of BIDS 1.9: a side file speaks for a recording when it lies in the
// recording's folder or in one above it within the data set, and each part of its name ("sub-01",
// "task-beat") is a part of the recording's. In one folder the file with most parts counts.
// Positions have a part that recordings have not, "space-...", which is let pass. The data set ends
// at the folder with dataset_description.json; where there is none, only the recording's own folder
// is searched.
#include "signal/side_files.hpp"

#include <headwater/base/error.hpp>
#include <headwater/base/labels.hpp>
#include <headwater/signal/recording.hpp>

#include <fmt/core.h>

#include <algorithm>
#include <optional>
#include <string_view>
#include <system_error>

namespace headwater {
namespace {

Labels parts_of(std::string_view name) {
  Labels parts;
  while (!name.empty()) {
    const auto end = std::min(name.find('_'), name.size());
    if (end > 0) parts.emplace_back(name.substr(0, end));
    name.remove_prefix(std::min(end + 1, name.size()));
  }
  return parts;
}

/// How many parts a file's name has when it speaks for the recording.
std::optional<std::size_t> fitting_parts(const std::string& file, const std::string& suffix,
                                         const Labels& recording, bool positions) {
  if (file.size() < suffix.size() ||
      file.compare(file.size() - suffix.size(), suffix.size(), suffix) != 0)
    return std::nullopt;
  const auto stem = std::string_view(file).substr(0, file.size() - suffix.size());
  if (!stem.empty() && stem.back() != '_') return std::nullopt;
  const Labels parts = parts_of(stem);
  for (const auto& part : parts)
    if (!find_label(recording, part) && !(positions && part.rfind("space-", 0) == 0))
      return std::nullopt;
  return parts.size();
}

std::filesystem::path best_of_folder(const std::filesystem::path& folder, const std::string& suffix,
                                     const Labels& recording) {
  const bool positions = suffix == "electrodes.tsv" || suffix == "coordsystem.json";
  std::vector<std::filesystem::path> best;
  std::size_t most = 0;
  std::error_code error;
  for (std::filesystem::directory_iterator at(folder, error), end; !error && at != end;
       at.increment(error)) {
    const auto parts = fitting_parts(at->path().filename().string(), suffix, recording, positions);
    if (!parts || (!best.empty() && *parts < most)) continue;
    if (*parts > most) best.clear();
    most = *parts;
    best.push_back(at->path());
  }
  if (best.empty()) return {};
  std::sort(best.begin(), best.end());
  if (best.size() > 1)
    throw InputError(
        fmt::format("{}: several files speak for one recording: {} and {}. Name the "
                    "one that counts.",
                    folder.string(), best[0].filename().string(), best[1].filename().string()));
  return best.front();
}

/// The recording's folder, then those above it to the root of the data set.
std::vector<std::filesystem::path> folders_of(const std::filesystem::path& recording) {
  std::error_code error;
  auto folder = std::filesystem::absolute(recording, error).lexically_normal().parent_path();
  std::vector<std::filesystem::path> folders;
  for (;; folder = folder.parent_path()) {
    folders.push_back(folder);
    if (std::filesystem::exists(folder / "dataset_description.json", error)) return folders;
    if (!folder.has_relative_path()) break;
  }
  folders.resize(1);
  return folders;
}

}  // namespace

std::vector<std::filesystem::path> side_files(const std::filesystem::path& recording,
                                              const std::string& suffix) {
  Labels parts = parts_of(recording.stem().string());
  if (parts.size() > 1 && parts.back() == "eeg") parts.pop_back();
  std::vector<std::filesystem::path> files;
  bool own = true;
  for (const auto& folder : folders_of(recording)) {
    const auto best = best_of_folder(folder, suffix, parts);
    // Beside the recording, the path as it was given: messages then name it as the user did.
    if (!best.empty()) files.push_back(own ? recording.parent_path() / best.filename() : best);
    own = false;
  }
  return files;
}

std::filesystem::path side_file(const std::filesystem::path& recording, const std::string& suffix) {
  const auto files = side_files(recording, suffix);
  return files.empty() ? std::filesystem::path() : files.front();
}

}  // namespace headwater
