// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/chunk_check.h"

#include <fmt/format.h>

#include <array>
#include <cstdint>
#include <fstream>
#include <string>
#include <string_view>

#include "quantity/failure.h"

namespace kneeprint {
namespace {

constexpr std::uint64_t kUnknownFrom = 0x7F000000;

class ChunkReader {
 public:
  explicit ChunkReader(const std::filesystem::path& file) : in_(file, std::ios::binary) {}

  /// Four characters, or an empty string past the end.
  std::string tag() {
    std::string s(4, '\0');
    return in_.read(s.data(), 4) ? s : std::string();
  }
  std::uint64_t number(int bytes, bool big_endian) {
    std::uint64_t value = 0;
    for (int i = 0; i < bytes; ++i) {
      const auto byte = static_cast<std::uint64_t>(static_cast<unsigned char>(in_.get()));
      value |= byte << 8 * (big_endian ? bytes - 1 - i : i);
    }
    return value;
  }
  std::uint64_t position() { return static_cast<std::uint64_t>(in_.tellg()); }
  void go(std::uint64_t to) { in_.seekg(static_cast<std::streamoff>(to)); }
  bool good() const { return in_.good(); }

 private:
  std::ifstream in_;
};

}  // namespace

void check_chunks_are_whole(const std::filesystem::path& file) {
  std::error_code no_size;
  const std::uint64_t have = std::filesystem::file_size(file, no_size);
  if (no_size) return;  // not a plain file
  ChunkReader in(file);
  const std::string outer = in.tag();
  const bool aiff = outer == "FORM";
  if (!aiff && outer != "RIFF" && outer != "RF64") return;
  in.number(4, aiff);
  in.tag();
  const std::string_view sound = aiff ? "SSND" : "data";
  std::uint64_t long_size = 0;  // RF64 keeps the 64-bit size in a chunk of its own
  for (std::string tag = in.tag(); !tag.empty(); tag = in.tag()) {
    std::uint64_t size = in.number(4, aiff);
    if (!in.good()) return;
    const std::uint64_t start = in.position();
    if (tag == "ds64") {
      in.number(8, false);
      long_size = in.number(8, false);
    }
    if (tag == sound) {
      if (outer == "RF64" && size == 0xFFFFFFFFu) {
        size = long_size;
      } else if (size >= kUnknownFrom) {
        return;
      }
      if (size > have - start) {
        throw InputError(
            fmt::format("{}: cut short: its header promises {} bytes of sound, {} are "
                        "there; copy or export the recording again",
                        file.string(), size, have - start));
      }
      return;
    }
    in.go(start + size + size % 2);
  }
}

}  // namespace kneeprint
