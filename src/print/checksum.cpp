// SPDX-License-Identifier: GPL-3.0-or-later
#include "print/checksum.h"

#include <fmt/format.h>

#include <boost/crc.hpp>

namespace kneeprint {

std::string crc32_hex(std::string_view bytes) {
  boost::crc_32_type crc;
  crc.process_bytes(bytes.data(), bytes.size());
  return fmt::format("{:08x}", crc.checksum());
}

}  // namespace kneeprint
