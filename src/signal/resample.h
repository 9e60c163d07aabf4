// SPDX-License-Identifier: GPL-3.0-or-later
// Reading a waveform between its samples: removal of a clock's offset and drift,
// and of a recorder's flutter.
#pragma once

#include <span>
#include <vector>

namespace kneeprint {

/// out[n] = x(start + n * step) for n = 0 .. count-1, with x the band-limited signal through `x`;
/// positions outside `x` read as silence.
/// Kaiser-windowed sinc (Kaiser 1974; Smith, "Digital audio resampling", CCRMA, from memory):
/// ripple and images stay under -140 dB from 0 to 0.907 of the lower of the two Nyquist rates when
/// step <= 1.2; step > 1 narrows the kernel's pass-band so that nothing folds. 0 < step <= 8.
std::vector<double> read_at(std::span<const double> x, double start, double step,
                            std::size_t count);

/// out[n] = x(positions[n]) by the same kernel: for positions that advance by nearly one sample,
/// such as a recorder's uneven time. Nothing is narrowed: where they advance by 1 + q, what lies
/// above 1 - q of the Nyquist rate folds to just below it. What is no number reads as silence.
std::vector<double> read_at(std::span<const double> x, std::span<const double> positions);

}  // namespace kneeprint
