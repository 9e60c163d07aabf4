// SPDX-License-Identifier: GPL-3.0-or-later
#include "print/checksum.h"

#include <fmt/format.h>
#include <zlib.h>

namespace kneeprint {

std::string crc32_hex(std::string_view bytes) {
  const uLong crc =
      crc32_z(0, reinterpret_cast<const Bytef*>(bytes.data()), static_cast<z_size_t>(bytes.size()));
  return fmt::format("{:08x}", crc);
}

}  // namespace kneeprint
