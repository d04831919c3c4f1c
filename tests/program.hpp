// SPDX-License-Identifier: GPL-3.0-or-later
// Runs the program as a user would, and says what came of it.
#pragma once
#include <headwater/base/atomic_file.hpp>

#include <fcntl.h>
#include <fmt/core.h>
#include <gtest/gtest.h>
#include <sys/wait.h>
#include <unistd.h>

#include <filesystem>
#include <map>
#include <string>
#include <vector>

namespace headwater {

struct ProgramRun {
  int exit_code = -1;  ///< 128 + signal when it crashed
  std::string out, err;
};

/// Runs the program with `arguments` in `folder`; its two streams go to files beside the folder.
inline ProgramRun run_program(const std::vector<std::string>& arguments,
                              const std::filesystem::path& folder) {
  const std::string out = folder.string() + ".out", err = folder.string() + ".err";
  std::vector<std::string> words{HEADWATER_PROGRAM};
  words.insert(words.end(), arguments.begin(), arguments.end());
  std::vector<char*> pointers;
  for (auto& word : words) pointers.push_back(word.data());
  pointers.push_back(nullptr);
  const auto open_for = [](const std::string& path, int stream) {
    const int file = ::open(path.c_str(), O_WRONLY | O_CREAT | O_TRUNC, 0600);
    return file >= 0 && ::dup2(file, stream) >= 0;
  };
  const pid_t child = ::fork();
  if (child == 0) {
    if (::chdir(folder.c_str()) == 0 && open_for(out, 1) && open_for(err, 2))
      ::execv(pointers[0], pointers.data());
    ::_exit(127);
  }
  int status = 0;
  if (child < 0 || ::waitpid(child, &status, 0) != child) return {};
  ProgramRun run;
  run.exit_code = WIFEXITED(status) ? WEXITSTATUS(status) : 128 + WTERMSIG(status);
  run.out = read_file(out, "standard output");
  run.err = read_file(err, "standard error");
  std::filesystem::remove(out);
  std::filesystem::remove(err);
  return run;
}

/// Every file below a folder: its relative path and its bytes.
inline std::map<std::string, std::string> files_below(const std::filesystem::path& folder) {
  std::map<std::string, std::string> files;
  if (!std::filesystem::exists(folder)) return files;
  for (const auto& entry : std::filesystem::recursive_directory_iterator(folder))
    if (entry.is_regular_file())
      files[entry.path().lexically_relative(folder).generic_string()] =
          read_file(entry.path(), "a result");
  return files;
}

/// No temporary files, nothing empty, every table with its description.
inline void expect_whole_files(const std::filesystem::path& folder) {
  const auto files = files_below(folder);
  for (const auto& [name, bytes] : files) {
    EXPECT_FALSE(bytes.empty()) << name;
    EXPECT_EQ(name.find(".part"), std::string::npos) << name;
    if (name.ends_with(".tsv")) {
      EXPECT_TRUE(files.count(name.substr(0, name.size() - 4) + ".json")) << name;
    }
  }
}

inline bool holds(const std::string& text, const std::string& part) {
  return text.find(part) != std::string::npos;
}

/// Expects each of `parts` in what the program said.
inline void expect_said(const std::string& said, const std::vector<std::string>& parts) {
  for (const auto& part : parts)
    EXPECT_TRUE(holds(said, part)) << part << "\n-- not in --\n" << said;
}

/// The text with the first occurrence of `what` replaced; a failure when there is none.
inline std::string with(std::string text, const std::string& what, const std::string& instead) {
  const auto at = text.find(what);
  EXPECT_NE(at, std::string::npos) << what;
  return at == std::string::npos ? text : text.replace(at, what.size(), instead);
}

}  // namespace headwater
