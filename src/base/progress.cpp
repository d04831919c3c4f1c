// SPDX-License-Identifier: GPL-3.0-or-later
#include <headwater/base/progress.hpp>

#include <fmt/core.h>
#include <sys/ioctl.h>
#include <unistd.h>

#include <algorithm>
#include <mutex>
#include <utility>

namespace headwater {
namespace {

constexpr std::size_t kBarWidth = 24;

std::size_t terminal_width(std::FILE* out) {
  winsize size{};
  if (::ioctl(::fileno(out), TIOCGWINSZ, &size) != 0 || size.ws_col == 0) return 80;
  return size.ws_col;
}

/// At most `columns` bytes, not cut inside a UTF-8 character.
std::string fitted(std::string text, std::size_t columns) {
  if (text.size() <= columns) return text;
  while (columns > 0 && (static_cast<unsigned char>(text[columns]) & 0xc0) == 0x80) --columns;
  text.resize(columns);
  return text;
}

}  // namespace

struct Progress::State {
  std::FILE* out;
  std::size_t total;
  std::string what;
  bool bar;
  std::size_t done = 0;
  std::mutex mutex{};

  void draw(const std::string& item) const {
    const std::size_t filled =
        total > 0 ? std::min(kBarWidth, done * kBarWidth / total) : kBarWidth;
    const std::string line = fmt::format("[{}{}] {}/{} {}{}{}", std::string(filled, '='),
                                         std::string(kBarWidth - filled, ' '), done, total, what,
                                         item.empty() ? "" : ": ", item);
    // The last column stays free: a line that reaches it would wrap. ESC [K clears the rest.
    fmt::print(out, "\r{}\x1b[K", fitted(line, terminal_width(out) - 1));
    std::fflush(out);
  }
};

Progress::Progress(std::FILE* out, std::size_t total, std::string what) {
  if (!out) return;
  state_.reset(new State{out, total, std::move(what), ::isatty(::fileno(out)) == 1});
  if (state_->bar) state_->draw("");
}

Progress::~Progress() {
  if (!state_ || !state_->bar) return;
  std::fputc('\n', state_->out);
  std::fflush(state_->out);
}

void Progress::advance(const std::string& item) {
  if (!state_) return;
  const std::lock_guard lock(state_->mutex);
  ++state_->done;
  if (state_->bar) {
    state_->draw(item);
  } else {
    fmt::print(state_->out, "{}: {} ({} of {})\n", state_->what, item, state_->done, state_->total);
    std::fflush(state_->out);
  }
}

}  // namespace headwater
