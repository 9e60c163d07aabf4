// SPDX-License-Identifier: GPL-3.0-or-later
// Modulation distortion: a strong low tone and a weak high one; the low tone's sidebands around the
// high one. IEC 60268-3 (modulation distortion of order n, from memory):
//   m2 = (|U(f2 - f1)| + |U(f2 + f1)|) / |U(f2)|        m3 = (|U(f2 - 2 f1)| + |U(f2 + 2 f1)|) /
//   |U(f2)| total = sqrt(m2^2 + m3^2)
// `smpte` is exactly 60 Hz and 7 kHz, 4:1 (SMPTE RP 120, number from memory). Peak equal to the
// sine's.
#pragma once

#include "method/method.h"

namespace kneeprint {

Method smpte_modulation();

}  // namespace kneeprint
