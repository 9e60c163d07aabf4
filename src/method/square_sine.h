// SPDX-License-Identifier: GPL-3.0-or-later
// Square and sine: the signal of dynamic intermodulation (dim_signal.h) as far as audio converters
// carry it. It is not called DIM: the standard's steepest slope lies in harmonics that converters
// do not pass. From 96 kHz rates on.
//
// Stimulus: the square of DIM 30 (one pole at 30 kHz) as the sum of its odd harmonics below X =
// 0.45 of the rate, each times sin(pi f / X) / (pi f / X): sigma factors (Lanczos, Applied
// Analysis, 1956, from memory), which leave 1.4 % of ringing at 96 kHz where a cut leaves 11 %. The
// sine has a quarter of the square's flat top. Both peaks, the ringing included, add to that of the
// sine whose level the drive names. The square is played at 3152 Hz (0.06 % up) with 15 kHz: at
// 3150 Hz every product would stand on a multiple of 50 Hz, where hum is.
//
// Reading: row `square-sine` of intermod.csv, the root sum of squares of the nine products |f2 - k
// f1|, k = 1 .. 9, over the sine; f1 the square's frequency, f2 the sine's, ratio 4. Products under
// the noise stay out of the value and widen its uncertainty. products.csv holds each, relative to
// the sine, with the square's fundamental and the sine. None of the nine falls on a harmonic of the
// square (f2 / f1 is no whole number), where it could not be read. scalars.csv says how much of the
// standard's signal this is: `slope-fraction`, steepest slope of the square played over that of the
// same square through one pole (states dim-30, dim-100), and `band-limit`, its highest harmonic in
// Hz. Floor: the rig's second and third harmonic, as what its curvature makes of the response.
#pragma once

#include "method/method.h"

namespace kneeprint {

inline constexpr Hertz kSquarePlayed{3152.0};

struct PlayedSquare {
  std::vector<std::complex<double>> harmonics;  ///< by n, 0 .. the last played; flat top 1
  Hertz band_limit;                             ///< frequency of the last
  double peak = 1.0;                            ///< of the wave, ringing included
  double steepest_slope = 0.0;                  ///< 1/s

  double peak_with_sine() const;  ///< both peaks: flat top 1, sine 1/4
};
/// The square as played at `rate` (> 0.02 MHz).
PlayedSquare played_square(Hertz rate);

Method square_sine();

}  // namespace kneeprint
