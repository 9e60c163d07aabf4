// SPDX-License-Identifier: GPL-3.0-or-later
// Silence: the noise and hum of the unit in two states, one after the other in one take.
//
//   drive-free      digital zero is sent
//   idle-with-bias  a low tone is sent, 997 Hz (in whole cycles) at the lowest rung's level
//
// Some gear rests when nothing comes in: a gate or an expander closes, a converter mutes itself, a
// dead zone or a steep origin of the curve hides or amplifies its own noise. The low tone keeps it
// at work, as AES17-2015 measures dynamic range in the presence of a signal (clause from memory);
// tone and harmonics, with whatever changes slowly in them, are then taken out before reading
// (method/tone_removal.h). What stays beside the tone (flutter, noise that the tone modulates)
// counts as noise; when it stands within 10 Hz of the tone and makes up more than a tenth of the
// state's noise, the state's noise is flagged `unsteady`.
//
// Figures (curves/scalars.csv, state = drive-free or idle-with-bias), all of them 20 Hz to 20 kHz
// (at most 0.45 of the sample rate), hum included, as recorded: the return's own response is not
// taken out.
//   noise            rms, unweighted, as the level of a sine of that rms, in the return's unit
//   noise-a          the same after A-weighting (IEC 61672-1)
//   noise-468        quasi-peak after the network of ITU-R BS.468-4: level of the steady 1 kHz sine
//                    that reads the same; in dBu what is also written dBqps (common practice). The
//                    reading is the mean of the pointer over the state.
//   hum              one row per mains multiple found (method/hum.h), frequency_hz its frequency
//   hum-total        rms sum of the rows above; with none found, an upper limit for all multiples
//                    to 2 kHz, flag `noise`
//   mains-frequency  Hz, mean over the state; only when hum was found
//
// Uncertainty: type A of a mean square P from one-sided density G over time T is that of Gaussian
// noise, var P = (1/T) int G^2 df, i.e. 2 T P^2 / int G^2 df degrees of freedom (Bendat & Piersol,
// "Random Data", from memory), lines adding 2 P_line G / T; when the blocks scatter more (0.1 %
// chi-square), their scatter replaces it. The quasi-peak reading uses the blocks' scatter, with the
// pointer's memory taken into account. Type B is the return's scale. A state below -150 dBFS is
// digital silence (24 bits alone round at -146): its rows have no value, flag `noise`.
//
// Options: duration_s, of each state; 5 s by default, at least 2 s; whole blocks. Each state is
// preceded by three of the plan's longest time constants.
#pragma once

#include "method/method.h"

namespace kneeprint {

Method silence();

}  // namespace kneeprint
