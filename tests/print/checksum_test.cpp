// SPDX-License-Identifier: GPL-3.0-or-later
#include "print/checksum.h"

#include <doctest/doctest.h>

namespace kneeprint {

TEST_CASE("the checksum is the CRC-32 of zip, with its leading zeros") {
  // Check value of CRC-32: Williams 1993, "A painless guide to CRC error detection algorithms", 15,
  // as in ITU-T V.42; from memory.
  CHECK(crc32_hex("123456789") == "cbf43926");
  CHECK(crc32_hex("") == "00000000");
  CHECK(crc32_hex(std::string_view("\0", 1)) == "d202ef8d");
}

}  // namespace kneeprint
