// SPDX-License-Identifier: GPL-3.0-or-later
// Programme-like drive: 31 tones a third of an octave apart, 21 Hz to 19.845 kHz, of equal power
// (signal/multitone_design.h), peak equal to the sine's. Everything between 20 Hz and 20 kHz (or
// 0.45 of the rate) that is not a tone is noise or distortion; distortion repeats from block to
// block of 1 s, noise does not. Gain errors of the tones themselves (compression, which is an odd
// order's doing) are not distortion here.
//
// Scalars, dB relative to the total power of the tones at the output:
//   noise-plus-distortion   mean square of all that is not a tone (nor DC), mains lines included
//   distortion              the periodic part of it; even-distortion and odd-distortion: its even
//                           and odd bins, products of even and of odd order
//   noise                   the part that does not repeat, per block of 1 s
//   mains-multiples         what stands on multiples of 50 and 60 Hz up to 1 kHz. Mains lines
//                           repeat as well, so that there hum and products of even order cannot be
//                           told apart: this part is neither distortion nor noise. What such lines
//                           leak when the mains is off is taken off (method/mains_lines.h)
//   fill                    percent, state "80 dB SPL": the share of bands 1 ERB wide, between
//                           whole ERB-numbers from 1 to 41 (26 Hz to 18.6 kHz), whose distortion
//                           stands above the masked threshold (signal/hearing.h, method/fill.h)
//   listening-level         dB SPL at which fill was judged
// Traces in dB SPL per band, x the band's centre: distortion, noise, noise-plus-distortion,
// masked-threshold.
//
// Option: listening_db_spl, what the whole multitone, as it leaves the unit, has at the listening
// place; 80 dB SPL otherwise. Fill assumes loudspeaker and room flat and free of distortion, and
// steady listening; distortion is compared band by band, its masking by the tones predicted by a
// simple model, what noise masks left out. Its uncertainty holds noise and rig, not the model. At
// the same THD a symmetric and an asymmetric curve fill about as many bands; even-distortion,
// odd-distortion and the bands in which they stand tell the two apart.
//
// Rig floor: orders 2 and 3 of the cable's residual at these converter levels, carried over to the
// multitone (MultitoneProducts). A tone that a reel recorded at a lower rate cannot show makes
// every figure incomplete: flagged alias. Needs 44.1 kHz.
#pragma once

#include "method/method.h"

namespace kneeprint {

inline constexpr double kDefaultListeningDbSpl = 80.0;

Method multitone();

}  // namespace kneeprint
