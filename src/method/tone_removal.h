// SPDX-License-Identifier: GPL-3.0-or-later
// A steady tone and its harmonics taken out of a waveform, so that what stands beside them can be
// read.
#pragma once

#include <span>

#include "method/coherent.h"

namespace kneeprint {

/// Subtracts the tone and its harmonics up to `orders` (those below half the rate), each with an
/// amplitude and phase that may change slowly: a polynomial of third degree in time, fitted by
/// projection on Legendre polynomials (Abramowitz & Stegun 1964, 22.2.10). What is left of a unit
/// still settling, or of a clock slightly off, goes with it; noise loses eight degrees of freedom
/// per order. Sample 0 is where a block of the tone begins; x.size() is best a multiple of its
/// block.
void remove_tones(std::span<double> x, const CoherentTone& tone, int orders);

}  // namespace kneeprint
