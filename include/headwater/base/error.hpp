// SPDX-License-Identifier: GPL-3.0-or-later
// The three kinds of trouble that stop work. Options and experiment files are checked before any
// work and report every problem at once (ExperimentError); broken input data stop one participant
// (InputError); a failed resource - disk, permission, renderer - stops what needed it
// (ResourceError). Numerical outcomes (rank, convergence, fit) are fields of results, not errors.
#pragma once
#include <stdexcept>
#include <string>

namespace headwater {

/// What went wrong, as the exit code of the program that met it.
enum class Trouble { experiment = 2, input = 3, some_participants = 4, resource = 5 };

/// Base of every exception thrown by Headwater. The message is complete: where (file, line, column
/// or channel), what was found, what was expected, what to do.
class Error : public std::runtime_error {
 public:
  Error(Trouble trouble, const std::string& message)
      : std::runtime_error(message), trouble_(trouble) {}
  Trouble trouble() const { return trouble_; }

 private:
  Trouble trouble_;
};

/// The command line, the experiment file, or an argument of a library call is wrong.
class ExperimentError : public Error {
 public:
  explicit ExperimentError(const std::string& message) : Error(Trouble::experiment, message) {}
};

/// Input data are wrong: a table, a volume, a recording.
class InputError : public Error {
 public:
  explicit InputError(const std::string& message) : Error(Trouble::input, message) {}
};

/// The machine failed us: disk full, no permission, no renderer.
class ResourceError : public Error {
 public:
  explicit ResourceError(const std::string& message) : Error(Trouble::resource, message) {}
};

}  // namespace headwater
