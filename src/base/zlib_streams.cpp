// SPDX-License-Identifier: GPL-3.0-or-later
#include "base/zlib_streams.hpp"

#include <zlib.h>

#include <algorithm>
#include <limits>
#include <new>
#include <stdexcept>

namespace headwater {
namespace {

constexpr int kLevel =
    1;  // maps are mostly noise in the low bits: higher levels cost time, not size
constexpr int kZlibFormat = 15, kGzipFormat = 15 + 16;

// zlib reads through pointers that are not const, and counts in unsigned int.
Bytef* input(std::string_view bytes) {
  return reinterpret_cast<Bytef*>(const_cast<char*>(bytes.data()));
}
uInt chunk(std::size_t size) {
  return static_cast<uInt>(std::min<std::size_t>(size, std::numeric_limits<uInt>::max()));
}

std::string deflated(std::string_view bytes, int format) {
  z_stream stream{};
  if (deflateInit2(&stream, kLevel, Z_DEFLATED, format, 9, Z_DEFAULT_STRATEGY) != Z_OK)
    throw std::bad_alloc();
  std::string result(deflateBound(&stream, bytes.size()), '\0');
  std::size_t taken = 0, made = 0;
  int state = Z_OK;
  while (state == Z_OK) {
    stream.next_in = input(bytes.substr(taken));
    stream.avail_in = chunk(bytes.size() - taken);
    stream.next_out = reinterpret_cast<Bytef*>(result.data() + made);
    stream.avail_out = chunk(result.size() - made);
    const uInt given = stream.avail_in, room = stream.avail_out;
    state = deflate(&stream, taken + given == bytes.size() ? Z_FINISH : Z_NO_FLUSH);
    taken += given - stream.avail_in;
    made += room - stream.avail_out;
  }
  deflateEnd(&stream);
  if (state != Z_STREAM_END) throw std::logic_error("deflate did not finish");
  result.resize(made);
  return result;
}

}  // namespace

std::string gzip(std::string_view bytes) {
  return deflated(bytes, kGzipFormat);
}
std::string deflate_block(std::string_view bytes) {
  return deflated(bytes, kZlibFormat);
}

bool is_gzip(std::string_view bytes) {
  return bytes.substr(0, 2) == "\x1f\x8b";
}

std::string gunzip(std::string_view bytes, std::size_t most) {
  z_stream stream{};
  if (inflateInit2(&stream, kGzipFormat) != Z_OK) throw std::bad_alloc();
  std::string result;
  std::size_t taken = 0, made = 0;
  int state = Z_OK;
  while (made < most && taken < bytes.size() && (state == Z_OK || state == Z_BUF_ERROR)) {
    if (made == result.size())
      result.resize(std::min(most, std::max<std::size_t>(1 << 16, 2 * result.size())));
    stream.next_in = input(bytes.substr(taken));
    stream.avail_in = chunk(bytes.size() - taken);
    stream.next_out = reinterpret_cast<Bytef*>(result.data() + made);
    stream.avail_out = chunk(result.size() - made);
    const uInt given = stream.avail_in, room = stream.avail_out;
    state = inflate(&stream, Z_NO_FLUSH);
    taken += given - stream.avail_in;
    made += room - stream.avail_out;
    // Several members may follow one another; what is no member after the first is padding.
    if (state == Z_STREAM_END && is_gzip(bytes.substr(taken))) state = inflateReset(&stream);
  }
  const std::string reason = stream.msg ? stream.msg : "";
  inflateEnd(&stream);
  if (state != Z_OK && state != Z_BUF_ERROR && state != Z_STREAM_END)
    throw std::runtime_error("damaged gzip data" + (reason.empty() ? "" : " (" + reason + ")"));
  result.resize(made);
  return result;
}

}  // namespace headwater
