// SPDX-License-Identifier: GPL-3.0-or-later
// What a mean power, or a quasi-peak reading, taken from a stretch of noise is worth.
#pragma once

#include <span>
#include <vector>

#include "method/noise_spectrum.h"
#include "quantity/uncertain.h"
#include "signal/weighting.h"

namespace kneeprint {

/// Mean squares of `blocks` equal stretches of x.
std::vector<double> block_powers(std::span<const double> x, int blocks);

/// Standard uncertainty of the mean square that Gaussian noise of this spectrum, weighted, has from
/// `low` to `high` over a time `length`: var P = (1 / length) int G^2 df (Bendat & Piersol, "Random
/// Data", from memory). Lines that stand out of the noise around them are steady; they only beat
/// with it: 2 P_line G / length.
double gaussian_power_u(const NoiseSpectrum& noise, Weighting weighting, Hertz low, Hertz high,
                        Seconds length);

/// Mean of `parts` (means over stretches that follow each other) and its standard uncertainty.
/// `expected_u` is what Gaussian noise of the known density gives the mean; it stands unless a
/// chi-square test at 0.1 % says that the parts scatter more: then their scatter alone. `shared`:
/// correlation of neighbouring parts.
Uncertain mean_power(std::span<const double> parts, double expected_u, double shared = 0.0);

/// Standard uncertainty of the mean of `parts` from their scatter alone.
Uncertain mean_by_scatter(std::span<const double> parts, double shared);

/// Mean of the quasi-peak meter's pointer over x, which is run through it twice: the first time
/// only brings the pointer to where it belongs. Type A from the scatter of `blocks` equal
/// stretches, the pointer's memory taken into account. `rate`: what the meter needs at least.
Uncertain quasi_peak_reading(std::span<const double> x, Hertz rate, int blocks);

}  // namespace kneeprint
