// SPDX-License-Identifier: GPL-3.0-or-later
// Where a known signal stands in a recording, to a fraction of a sample.
#pragma once

#include <span>

namespace kneeprint {

struct Delay {
  double samples = 0.0;   ///< recording[n] ~ gain * known[n - samples]; may be negative
  double gain = 0.0;      ///< least-squares gain at that delay, signed: negative means inverted
  double match = 0.0;     ///< normalised correlation at the peak, 0 .. 1 in magnitude
};

/// Cross-correlation by FFT, its largest magnitude refined by band-limited interpolation (the
/// correlation is sampled at the signal's own rate, so zero-padding its spectrum is exact).
/// Delays from `earliest` to `latest` samples are searched. Both spans non-empty.
/// For a broadband `known` at 40 dB signal-to-noise the error stays under 0.01 sample.
Delay find_delay(std::span<const double> known, std::span<const double> recording, long earliest,
                 long latest);

}  // namespace kneeprint
