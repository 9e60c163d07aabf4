// SPDX-License-Identifier: GPL-3.0-or-later
#pragma once

#include <array>
#include <cmath>
#include <numbers>

#include "method/dim_signal.h"
#include "signal/waveform.h"

namespace kneeprint::testing {

// What a recorder with a steep filter makes of an analogue generator and a unit that adds products
// of known ratio to the sine: every component below half the rate, summed as cosines of the running
// phases of square and sine.
struct DimGenerator {
  double square = 3150.0, sine = 15000.0;
  double drift = 0.0;  // Hz per second of the square
  double top = 0.4;    // flat top of the square; the sine has a quarter
  Hertz pole = kDim30Pole;
  std::array<double, 9> products{};  // over the sine, k = 1 .. 9
  double seconds = 5.0, silence = 0.7;

  Waveform at(Hertz rate) const {
    Waveform w;
    w.rate = rate;
    const auto quiet = samples_in(Seconds(silence), rate);
    const auto length = samples_in(Seconds(seconds), rate);
    w.samples.assign(length + 2 * quiet, 0.0);
    for (std::size_t n = 0; n < length; ++n) {
      const double t = static_cast<double>(n) / rate.value();
      const double f = square + drift * t;
      const double turns = square * t + 0.5 * drift * t * t;
      const double a = 2.0 * std::numbers::pi * (turns - std::floor(turns)) + 0.7;
      const double s = 2.0 * std::numbers::pi * (sine * t - std::floor(sine * t)) + 0.3;
      double y = top / 4.0 * std::cos(s);
      for (int h = 1; h * f < 0.46 * rate.value(); h += 2) {
        y += top * (square_harmonic(h, kDimSquare, pole) * std::polar(1.0, h * a)).real();
      }
      for (int k = 1; k <= 9; ++k) {
        const double ratio = products[static_cast<std::size_t>(k) - 1];
        if (ratio != 0.0) y += top / 4.0 * ratio * std::cos(k * a - s + 0.2 * k);
      }
      w.samples[quiet + n] = y;
    }
    return w;
  }
};

}  // namespace kneeprint::testing
