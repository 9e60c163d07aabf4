// SPDX-License-Identifier: GPL-3.0-or-later
// Modulation distortion: a strong low tone and a weak high one; the low tone's sidebands around the
// high one. IEC 60268-3 (modulation distortion of order n, from memory):
//   m2 = (|U(f2 - f1)| + |U(f2 + f1)|) / |U(f2)|
//   m3 = (|U(f2 - 2 f1)| + |U(f2 + 2 f1)|) / |U(f2)|
//   total = sqrt(m2^2 + m3^2)
// Beside them, under names of their own, with root sums of squares in place of the arithmetic ones
// (common practice): m2-rss, m3-rss, total-rss. A pure AM or PM pair reads sqrt 2 lower there.
// m2 and m3 carry the pair's amplitude and phase modulation parts. products.csv lists what stands
// at every k1 f1 + k2 f2 to order 5, relative to f2.
//
// After the two tones f2 sounds alone at its level: products less than 10 dB above what stands
// there then are flagged `floor`. Peak equal to the sine's.
#pragma once

#include "method/method.h"

namespace kneeprint {

/// `smpte`: exactly 60 Hz and 7 kHz, 4:1 (SMPTE RP 120, number from memory). No options.
Method smpte_modulation();
/// `din`: exactly 250 Hz and 8 kHz, 4:1 (DIN 45403, from memory). No options.
Method din_modulation();
/// `modulation`: any pair (tones_hz, required) and ratio (4 by default).
Method modulation();

}  // namespace kneeprint
