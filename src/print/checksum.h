// SPDX-License-Identifier: GPL-3.0-or-later
// The checksum that tells a take or a journal line from one that was changed or damaged.
#pragma once

#include <string>
#include <string_view>

namespace kneeprint {

/// CRC-32 (ISO-HDLC: polynomial 0x04C11DB7, reflected, as in zip) as 8 lower-case hex digits.
/// Finds every error of a single bit, and every burst of up to 32 [Peterson & Brown 1961, "Cyclic
/// codes for error detection", Proc. IRE 49, theorem 3, from memory].
std::string crc32_hex(std::string_view bytes);

}  // namespace kneeprint
