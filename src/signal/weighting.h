// SPDX-License-Identifier: GPL-3.0-or-later
// Weighting networks for noise, as exact responses of the analogue networks that the standards
// define: no bilinear warping near half the sample rate. Each is 0 dB at 1 kHz.
//
//   A    IEC 61672-1:2013 Annex E: R_A(s) = k s^4 / ((s + w1)^2 (s + w2) (s + w3) (s + w4)^2), the
//        four corner frequencies from f_r = 1000, f_L = 10^1.5, f_H = 10^3.9, f_A = 10^2.45 Hz
//   468  ITU-R BS.468-4: its passive network in rational form (widely printed constants, from
//        memory of no clause; it meets the Recommendation's table within 0.051 dB, which the tests
//        check)
#pragma once

#include <complex>

#include "signal/waveform.h"

namespace kneeprint {

/// Complex response at a frequency >= 0.
using Weighting = std::complex<double> (*)(Hertz);

std::complex<double> flat_weighting(Hertz f);  ///< 1 everywhere
std::complex<double> a_weighting(Hertz f);
std::complex<double> itu468_weighting(Hertz f);

/// `x` through the network and a band from `low` to `high`, both kept, with edges as steep as the
/// length allows and without phase of their own. The result has `oversampling` (>= 1) times the
/// rate and as many times the samples: between the samples stand the peaks that a quasi-peak meter
/// must see. Padded by 0.1 s of silence, in which every network has decayed by 110 dB; `x` should
/// begin and end softly. Nothing from half the rate up is kept.
Waveform weighted(const Waveform& x, Weighting weighting, Hertz low, Hertz high,
                  int oversampling = 1);

}  // namespace kneeprint
