// SPDX-License-Identifier: GPL-3.0-or-later
// Difference-frequency distortion: two equal tones close together. IEC 60268-3
// (difference-frequency distortion of order n, from memory), referred to the arithmetic sum of both
// output tones:
//   d2 = |U(f2 - f1)| / (|U(f1)| + |U(f2)|)
//   d3 = (|U(2 f1 - f2)| + |U(2 f2 - f1)|) / (|U(f1)| + |U(f2)|)
//   total = sqrt(d2^2 + d3^2)
// `ccif` is 19 and 20 kHz, 1:1 (frequencies from memory). Peak equal to the sine's.
#pragma once

#include "method/method.h"

namespace kneeprint {

Method ccif_difference();

}  // namespace kneeprint
