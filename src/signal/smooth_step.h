// SPDX-License-Identifier: GPL-3.0-or-later
// A rise from 0 to 1 so smooth that it colours nothing more than four periods away: the running
// integral of the four-term Blackman-Harris window (Harris, Proc. IEEE 66(1) 1978, table I), whose
// spectrum stays 92 dB down from 4 / length on.
#pragma once

#include <span>

namespace kneeprint {

/// 0 for x <= 0, 1 for x >= 1, monotone between; step(x) + step(1 - x) = 1.
double smooth_step(double x);

/// samples[i] *= smooth_step(x + i * dx), by a recurrence where the step is not flat. dx may be
/// negative (a fall), not zero.
void apply_smooth_step(std::span<double> samples, double x, double dx);

}  // namespace kneeprint
