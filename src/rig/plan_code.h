// SPDX-License-Identifier: GPL-3.0-or-later
// 32 bits as sound: eight tone bursts, one hexadecimal digit each by its frequency, the least
// significant first. Survives saturation, inversion, filters and noise.
#pragma once

#include <cstdint>
#include <optional>
#include <span>
#include <vector>

#include "quantity/quantity.h"

namespace kneeprint {

/// Length in samples, at any rate from 8 kHz on.
std::size_t plan_code_length(Hertz rate);

/// Peak 1.
std::vector<double> plan_code_sound(std::uint32_t code, Hertz rate);

/// `heard` starts with the code, to a few milliseconds, and is not shorter (else
/// std::invalid_argument). Nothing when a digit's tone does not stand out from the other fifteen.
std::optional<std::uint32_t> read_plan_code(std::span<const double> heard, Hertz rate);

}  // namespace kneeprint
