// SPDX-License-Identifier: GPL-3.0-or-later
// The signal of dynamic intermodulation: a 3.15 kHz square through one pole, with a 15 kHz sine,
// 4:1 peak to peak. IEC 60268-3 (from memory), after Leinonen, Otala and Curl (JAES 1977, year from
// memory): the pole is at 30 kHz for DIM 30, at 100 kHz for DIM 100; the figure is the root sum of
// squares of the nine products |15 kHz - k 3.15 kHz|, k = 1 .. 9, over the 15 kHz tone.
#pragma once

#include <array>
#include <complex>
#include <span>

#include "method/products.h"
#include "method/reading.h"

namespace kneeprint {

inline constexpr Hertz kDimSquare{3150.0};
inline constexpr Hertz kDimSine{15000.0};
inline constexpr Hertz kDim30Pole{30000.0};
inline constexpr Hertz kDim100Pole{100000.0};
inline constexpr double kDimRatio = 4.0;  ///< square over sine, peak to peak

/// The nine products, k = 1 .. 9, each at a positive frequency: 11.85, 8.70, 5.55, 2.40,
/// 0.75, 3.90, 7.05, 10.20, 13.35 kHz.
std::array<ProductIndex, 9> dim_products();

/// Harmonic n (odd; even ones are 0) of a square of +-1 through one pole: peak amplitude and phase,
/// cosine reference, edge upward at time 0. (Fourier series of the square; 1 / (1 + j f / pole).)
std::complex<double> square_harmonic(int n, Hertz fundamental, Hertz pole);

/// Steepest slope, in 1/s, of that square: right after an edge it starts from the other side's
/// settled value, tanh(T / 4 tau) of 1, so (1 + tanh(T / 4 tau)) / tau.
double steepest_slope(Hertz fundamental, Hertz pole);

/// Root sum of squares of products over the sine, as root_sum_of(); but when all of them together
/// hold no more power than noise alone exceeds in 5 % of cases (chi-square of two degrees of
/// freedom each), the figure is the root sum of their limits, flagged noise: of nine products under
/// the noise some one passes its own threshold in 37 % of cases.
RelativeReading dim_figure(std::span<const Line> products,
                           std::span<const RelativeReading> readings, const Line& sine);

}  // namespace kneeprint
