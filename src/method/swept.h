// SPDX-License-Identifier: GPL-3.0-or-later
// Swept sine: the responses of orders 1 .. N over the fundamental's frequency, at one drive.
//
// A synchronised exponential sweep (Farina, AES 108th convention, 2000; Novak, Lotton & Simon,
// J. Audio Eng. Soc. 63(10), 2015) from 10 Hz to 0.49 of the rate, with a gap after it, is played
// at least twice (three times at first); its peak is that of the sine at the rung's drive. It is
// at full level from 20 Hz to 0.46 of the rate. The plan's step option `duration_s` is the length
// of one sweep, 5 s by default; below 4 s, which a rise of 4 periods needs, 4 s are played.
//
// Rows of response.csv, method "sweep", per order n at twelve fundamentals f an octave, from 50 Hz
// to where n f reaches 0.45 of the rate:
//   magnitude_db   level of order n at the output less the drive
//   phase_deg      n = 1: output less input, the rig's delay removed; n > 1: cosine reference, less
//                  n times the phase of the output's fundamental at f, as in harmonics.csv
//   expanded_u_db  95 %: noise and drift from the repeats, rig floor, full scales, and the sweep's
//                  own speed: a filter before the unit's curve answers a moving frequency otherwise
//                  than a steady one, by f' / (4 pi) |H''/H| at first order (stationary phase
//                  expansion of the filter's response). How much of the response stands before the
//                  curve is unknown: all of it is the bound, taken n times for order n. It shrinks
//                  as the sweep gets longer.
// The rig's own response, where a loop showed it, is taken out as for steady sines.
// With a reference return, drive and input are the reference's own response.
#pragma once

#include "method/method.h"

namespace kneeprint {

Method swept_sine();

/// The fundamentals of the rows.
std::vector<Hertz> swept_fundamentals(Hertz usable_rate);

}  // namespace kneeprint
