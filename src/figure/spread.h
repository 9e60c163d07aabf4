// SPDX-License-Identifier: GPL-3.0-or-later
// Labels in a column, moved as little as possible until none overlaps.
#pragma once

#include <vector>

namespace kneeprint {

/// Positions nearest to `wanted` in the sense of least squares with at least `gap` between
/// neighbours (pool adjacent violators: Ayer, Brunk, Ewing, Reid & Silverman 1955), kept within
/// [low, high] as far as there is room; where there is none the gap shrinks. Answers in the order
/// of `wanted`.
std::vector<double> spread_labels(const std::vector<double>& wanted, double gap, double low,
                                  double high);

}  // namespace kneeprint
