// SPDX-License-Identifier: GPL-3.0-or-later
// Hum: lines at multiples of the mains frequency, found in noise.
//
// The mains frequency is estimated from the recording: 50 and 60 Hz are tried, each 1 % up and down
// (EN 50160 allows as much), and all multiples up to 2 kHz speak together. A multiple is read in a
// band that holds its line also when the mains wanders by 0.05 Hz, over the median of the noise
// beside it. It counts as found when its power over that noise exceeds the F quantile at 5 % for
// the whole family, i.e. 5 % divided by the number of all multiples at all frequencies tried
// (Bonferroni): in 95 of 100 recordings without hum nothing is listed. Without a line at one of the
// first twelve multiples nothing is called hum (common practice: a lone whistle at 1 kHz is none).
#pragma once

#include <optional>
#include <vector>

#include "method/noise_spectrum.h"
#include "quantity/quantity.h"
#include "quantity/uncertain.h"

namespace kneeprint {

/// Segments that hum is searched in: long enough to part the multiples, short enough for a mains
/// that wanders.
inline constexpr Seconds kHumSegment{1.0};

struct HumLine {
  int multiple = 1;
  double frequency_hz = 0.0;  ///< multiple times the mains frequency
  Uncertain power;            ///< mean square
};

struct Hum {
  int base_hz = 0;             ///< 50 or 60; 0: no hum found
  Uncertain frequency;         ///< mean over the recording, Hz; when found
  std::vector<HumLine> lines;  ///< those found, ascending
  Uncertain total;             ///< mean square of them all
  double limit = 0.0;          ///< 95 % upper limit of the mean square when none is found
};

/// `noise` by segments of kHumSegment. Multiples closer than 5 Hz to `tone` are not read.
Hum find_hum(const NoiseSpectrum& noise, std::optional<Hertz> tone = {});

}  // namespace kneeprint
