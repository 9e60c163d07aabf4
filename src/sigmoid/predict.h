// SPDX-License-Identifier: GPL-3.0-or-later
// What a memoryless curve does to one and to two sines. Amplitudes are signed peaks, in the curve's
// own units: positive when the component is at its crest together with the sines.
#pragma once

#include <functional>
#include <utility>
#include <vector>

namespace kneeprint {

/// Cosine-series coefficients H_0 .. H_orders (signed peaks) of curve(A cos theta), by the periodic
/// trapezoid rule, which converges geometrically for analytic curves (Trefethen & Weideman, SIAM
/// Review 56(3) 2014). H_n read so holds H_(points-n), H_(points+n), ... as well (aliasing): a
/// curve with a corner wants more points. `points` per period: even, > 2 * orders.
std::vector<double> sine_harmonics(const std::function<double(double)>& curve, double amplitude,
                                   int orders, int points = 512);

/// Signed peak amplitude of the products k1 f1 + k2 f2 of curve(U1 cos a + U2 cos b), a and b
/// independent (incommensurate tones): 2-D trapezoid rule. (k1, k2) != (0, 0). `points` per period
/// of either tone: even, > 2 max(|k1|, |k2|).
std::vector<double> two_tone_products(const std::function<double(double)>& curve, double u1,
                                      double u2, const std::vector<std::pair<int, int>>& products,
                                      int points = 256);

}  // namespace kneeprint
