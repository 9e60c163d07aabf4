// SPDX-License-Identifier: GPL-3.0-or-later
#include "platform/read_text.h"

#include <array>
#include <cerrno>
#include <fstream>
#include <system_error>

#include "quantity/failure.h"

namespace kneeprint {

std::string read_text(const std::filesystem::path& file) {
  errno = 0;
  std::ifstream in(file, std::ios::binary);
  std::string bytes;
  std::array<char, 65536> chunk;
  while (in) {
    in.read(chunk.data(), chunk.size());
    bytes.append(chunk.data(), static_cast<std::size_t>(in.gcount()));
  }
  // The end of the file fails the last read; anything else leaves the stream closed or bad.
  if (!in.is_open() || in.bad()) {
    const std::string reason =
        errno != 0 ? std::error_code(errno, std::generic_category()).message() : "unknown reason";
    throw InputError(file.string() + ": cannot be read: " + reason);
  }
  return bytes;
}

}  // namespace kneeprint
