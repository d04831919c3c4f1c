// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/atomic_file.hpp>
#include <headwater/base/error.hpp>

#include <fcntl.h>
#include <fmt/core.h>
#include <sys/stat.h>
#include <unistd.h>

#include <atomic>
#include <cerrno>
#include <system_error>
#include <utility>

namespace headwater {
namespace {

std::string reason(int error) {
  return std::generic_category().message(error);
}

[[noreturn]] void fail(const std::filesystem::path& path, int error) {
  throw ResourceError(
      fmt::format("{}: cannot be written: {}. Check that the folder may be written to "
                  "and that the disk has room.",
                  path.string(), reason(error)));
}

/// An open file descriptor; closes itself.
class Descriptor {
 public:
  explicit Descriptor(int number) : number_(number) {}
  ~Descriptor() {
    if (number_ >= 0) ::close(number_);
  }
  Descriptor(const Descriptor&) = delete;
  Descriptor& operator=(const Descriptor&) = delete;
  int number() const { return number_; }
  /// Network file systems report a full disk only here.
  bool close() { return ::close(std::exchange(number_, -1)) == 0; }

 private:
  int number_;
};

/// Removes the temporary file unless it has been renamed.
struct Temporary {
  std::filesystem::path path;
  ~Temporary() {
    if (!path.empty()) ::unlink(path.c_str());
  }
};

/// O_EXCL rather than mkstemp: the file gets the permissions that the user's umask asks for. The
/// name is short, so that a long final name fits too.
int create_temporary(const std::filesystem::path& folder, std::filesystem::path& name) {
  static std::atomic<unsigned> counter{0};
  for (int attempt = 0; attempt < 1000; ++attempt) {
    name = folder / fmt::format(".headwater-{}-{}.part", ::getpid(), counter++);
    const int number = ::open(name.c_str(), O_WRONLY | O_CREAT | O_EXCL | O_CLOEXEC, 0666);
    if (number >= 0 || errno != EEXIST) return number;
  }
  return -1;
}

bool write_all(int number, std::string_view bytes) {
  while (!bytes.empty()) {
    const ssize_t written = ::write(number, bytes.data(), bytes.size());
    if (written < 0 && errno == EINTR) continue;
    if (written < 0) return false;
    bytes.remove_prefix(static_cast<std::size_t>(written));
  }
  return true;
}

}  // namespace

void write_file(const std::filesystem::path& path, std::string_view bytes) {
  const auto folder = path.has_parent_path() ? path.parent_path() : std::filesystem::path(".");
  std::error_code error;
  std::filesystem::create_directories(folder, error);
  if (error) fail(path, error.value());

  std::filesystem::path name;
  Descriptor file(create_temporary(folder, name));
  if (file.number() < 0) fail(path, errno);
  Temporary temporary{name};
  if (!write_all(file.number(), bytes) || ::fsync(file.number()) != 0 || !file.close())
    fail(path, errno);
  if (::rename(name.c_str(), path.c_str()) != 0) fail(path, errno);
  temporary.path.clear();
  // The new name itself reaches the disk with its folder. Some file systems refuse; the content is
  // safe.
  const Descriptor directory(::open(folder.c_str(), O_RDONLY | O_DIRECTORY | O_CLOEXEC));
  if (directory.number() >= 0) ::fsync(directory.number());
}

std::string read_file(const std::filesystem::path& path, std::string_view what) {
  const auto refuse = [&](int error) {
    throw InputError(
        fmt::format("{}: the {} cannot be read: {}.", path.string(), what, reason(error)));
  };
  const Descriptor file(::open(path.c_str(), O_RDONLY | O_CLOEXEC));
  if (file.number() < 0) refuse(errno);
  struct stat status {};
  if (::fstat(file.number(), &status) != 0) refuse(errno);
  if (S_ISDIR(status.st_mode)) refuse(EISDIR);

  // One byte more than the stated size, so that the end is met without growing.
  std::string result(static_cast<std::size_t>(status.st_size) + 1, '\0');
  std::size_t filled = 0;
  for (;;) {
    if (filled == result.size()) result.resize(2 * result.size());
    const ssize_t got = ::read(file.number(), result.data() + filled, result.size() - filled);
    if (got < 0 && errno == EINTR) continue;
    if (got < 0) refuse(errno);
    if (got == 0) break;
    filled += static_cast<std::size_t>(got);
  }
  result.resize(filled);
  return result;
}

}  // namespace headwater
