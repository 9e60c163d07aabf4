// SPDX-License-Identifier: GPL-3.0-or-later
// The multitone: which tones, at which phases. One design serves every sample rate of 44.1 kHz and
// more.
//
// Tones. 31, equally strong, a third of an octave apart from 21 Hz to 19.845 kHz (0.45 of 44.1
// kHz): equal power per third of an octave, the tilt of pink noise, stands for programme (common
// practice). Each is a whole and odd number of cycles in a block of 1 s (an odd multitone;
// Pintelon & Schoukens, System Identification, 2nd ed. 2012, from memory), hence
//  - products of even order fall on even bins, products of odd order on odd bins: the two kinds of
//    curvature are read apart; no tone ever stands on a product of even order;
//  - no tone and no product of odd order falls on a multiple of 50 or 60 Hz.
// No tone falls on a product of order 3 of two others (2a + b, 2a - b, 3a). Products of three
// others (a + b - c) are too many at the low end of this grid to avoid all: in 12 foursomes each
// tone falls on a product of the other three. A greedy search from the lowest tone upwards chose
// the tones, nearest to the exact thirds of an octave, against those coincidences and against
// products of order 2 on multiples of 50 and 60 Hz up to 1 kHz (15 lines are left there).
//
// Phases. From random phases, the p-norm of the waveform was brought down by gradient for p = 8,
// 16, .. 128 (Guillaume, Schoukens, Pintelon & Kollar, IEEE Trans. IM 40(6), 1991, from memory),
// the best of 952 starts kept; 300 rounds of clipping (Van der Ouderaa, Schoukens &
// Renneboog, IEEE Trans. IM 37(1), 1988, from memory) reach only 3.6 with tones as sparse as these.
// The crest factor is 3.07; all cosines in step would have 7.87. The highest crest
// stands at the block's first sample, so that it is reached exactly at every sample rate.
#pragma once

#include <array>
#include <cstddef>
#include <vector>

#include "quantity/quantity.h"

namespace kneeprint {

struct MultitoneTone {
  std::size_t cycles = 0;  ///< in a block of 1 s
  double phase = 0.0;      ///< radians, cosine reference, at the block's start
};

inline constexpr std::size_t kMultitoneTones = 31;
const std::array<MultitoneTone, kMultitoneTones>& multitone_tones();

/// Peak over rms: 3.074 (9.75 dB; a sine has 1.414).
double multitone_crest();

/// Samples of a block at `rate`: 1 s, made even so that products folded at half the rate keep their
/// parity.
std::size_t multitone_block(Hertz rate);

/// One block, peak 1. `samples` >= 2 * 19845 + 1 holds every tone; tones at or above half of that
/// are left out.
std::vector<double> multitone_period(std::size_t samples);

/// What a weakly curved rig shows with the multitone. Per bin up to 20 kHz, as rms over the tones'
/// total rms, for a rig whose sine of the same peak P shows a second (third) harmonic of 1: with
/// y = x + a2 x^2 + a3 x^3 those harmonics are a2 P / 2 and a3 P^2 / 4 (expansion of cos^2 and
/// cos^3). Bins of tones hold 0.
struct MultitoneProducts {
  std::vector<double> second, third;
};
const MultitoneProducts& multitone_products();

}  // namespace kneeprint
