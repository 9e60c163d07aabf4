// SPDX-License-Identifier: GPL-3.0-or-later
// What the rig's own curvature adds to each order of a response that has harmonics itself.
#pragma once

#include <complex>
#include <span>
#include <vector>

namespace kneeprint {

/// The rig as y + a2 y^2 + a3 y^3, with a2 and a3 from what it shows with a pure sine of the same
/// fundamental: its second harmonic is a2 / 2 and its third a3 / 4 of the fundamental (expansion of
/// cos^2 and cos^3). A response with harmonics of its own goes through the same curve as a whole,
/// so each of its orders, the fundamental too, is touched. `harmonics`: orders 0 .. N relative to
/// the fundamental, cosine reference. `second`, `third`: the rig's residual ratios. Returns orders
/// 0 .. N, magnitudes relative to the fundamental; both parts are added in magnitude, since their
/// signs are unknown.
std::vector<double> curvature_floor(std::span<const std::complex<double>> harmonics, double second,
                                    double third);

}  // namespace kneeprint
