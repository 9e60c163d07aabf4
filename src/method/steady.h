// SPDX-License-Identifier: GPL-3.0-or-later
// Steady sine: harmonics, gain, DC, THD, THD+N, SINAD, noise and even/odd balance at one frequency
// and one drive.
//
// Definitions (the README, "The tables, column by column", repeats them):
//   relative_db  20 log10 (|H_n| / |H_1|)
//   phase        arg H_n - n arg H_1, cosine reference
//   THD_F        sqrt(sum_{n=2..N} |H_n|^2) / |H_1|, N the last order below min(20 kHz, 0.45 rate)
//   THD_R        THD_F / sqrt(1 + THD_F^2)
//   THD+N        rms of everything from 20 Hz to 20 kHz but the fundamental (removed as by a
//                least-squares sine fit: AES17-2015 as discussed by Roney & Temme, AES 143 paper
//                9900, 2017), over the rms of the whole in that band
//   SINAD        |H_1| rms over that same residual (IEEE Std 1057-2017, from memory)
//   noise        the residual less every harmonic in the band
//   even/odd     20 log10 of rss(H2, H4, ...) over rss(H3, H5, ...)
#pragma once

#include "method/method.h"

namespace kneeprint {

Method steady_sine();

/// The frequency that is played for `asked`.
Hertz steady_frequency(const TakeSpec& spec, Hertz rate);

}  // namespace kneeprint
