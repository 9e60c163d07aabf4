// SPDX-License-Identifier: GPL-3.0-or-later
// Difference-frequency distortion: two equal tones close together. IEC 60268-3 (from memory), all
// referred to the arithmetic sum of both output tones:
//   d2 = |U(f2 - f1)| / (|U(f1)| + |U(f2)|)
//   d3 = (|U(2 f1 - f2)| + |U(2 f2 - f1)|) / (|U(f1)| + |U(f2)|)
//   total = sqrt(d2^2 + d3^2)
// Beside them, with a root sum of squares in place of the arithmetic sum (common practice): d3-rss,
// total-rss. Total difference-frequency distortion (`tdfd`, after Thiele, from memory) has f1 = 2
// f0 and f2 = 3 f0 - d, so that the lower products of second and third order come together around
// f0:
//   total = sqrt(|U(f2 - f1)|^2 + |U(2 f1 - f2)|^2) / (|U(f1)| + |U(f2)|)
// products.csv lists what stands at every k1 f1 + k2 f2 to order 5, relative to the sum of both
// tones. Peak equal to the sine's.
#pragma once

#include "method/method.h"

namespace kneeprint {

/// `ccif`: 19 and 20 kHz, 1:1 (frequencies from memory), or the pair that tones_hz gives (14 and 15
/// kHz, 11 and 12 kHz).
Method ccif_difference();
/// `tdfd`: exactly 8 and 11.95 kHz, 1:1 (f0 = 4 kHz, d = 50 Hz); its products stand at 3.95 and
/// 4.05 kHz. No options.
Method total_difference();

}  // namespace kneeprint
