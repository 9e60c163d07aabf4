// SPDX-License-Identifier: GPL-3.0-or-later
// Frequencies and blocks such that whole cycles fill a block: then a rectangular window reads every
// harmonic without leakage (coherent sampling, IEEE Std 1057-2017, 4.1.4, from memory).
#pragma once

#include <cstddef>
#include <span>

#include "quantity/quantity.h"

namespace kneeprint {

struct CoherentTone {
  Hertz frequency{0.0};    ///< as played
  std::size_t block = 0;   ///< samples
  std::size_t cycles = 0;  ///< per block
};

/// The frequency nearest to `asked`, shifted by at most 0.1 %, of which whole cycles fill a block
/// at least `wanted` long, and none of whose harmonics 1 .. orders comes within 1 Hz (where 0.1 %
/// leaves no room: 0.2 Hz, then 0.1 Hz) of a multiple of 50 or 60 Hz. Blocks are multiples of 0.1 s
/// where the rate allows, so that mains lines, too, fill whole cycles and do not leak. The block is
/// lengthened (to 10 s at most) when no such frequency exists; when none keeps clear of the mains
/// the nearest coherent one is taken. asked: above 0, below half the rate.
CoherentTone coherent_tone(Hertz asked, Hertz rate, Seconds wanted, int orders);

/// Samples of the shortest block at least `wanted` long in which every tone fills whole cycles (to
/// one part in 10^9). Tones are multiples of 1 Hz at the usual rates, so 1 s always serves.
std::size_t common_block(std::span<const Hertz> tones, Hertz rate, Seconds wanted);

struct CoherentPair {
  Hertz f1{0.0}, f2{0.0};  ///< as played
  std::size_t block = 0;   ///< samples
  std::size_t cycles1 = 0, cycles2 = 0;
};

/// Two tones of which whole cycles fill a block at least `wanted` long, with at least every second
/// bin free of their products, so that the noise shows. Exactly those asked for where a block at
/// most 2 s longer holds them (whole hertz); else the shortest block, up to 10 s longer, in which
/// neither tone nor their difference is shifted by more than 0.1 %. Throws InputError when there is
/// none: tones under 1 Hz, equal, or too close.
CoherentPair coherent_pair(Hertz f1, Hertz f2, Hertz rate, Seconds wanted);

}  // namespace kneeprint
