// SPDX-License-Identifier: GPL-3.0-or-later
// The synchronised exponential sweep
//   x(t) = cos(phi(t)),  phi(t) = 2 pi f1 L exp(t / L),  instantaneous frequency f1 exp(t / L)
// (Farina, AES 108th convention, 2000; without the "- 1" in the phase after Novak, Lotton & Simon,
// J. Audio Eng. Soc. 63(10), 2015, from memory; a cosine here, so that a memoryless curve's orders
// are real). Its n-th harmonic cos(n phi(t)) is the sweep itself, earlier by L ln n, exactly.
#pragma once

#include <complex>
#include <cstddef>
#include <vector>

#include "quantity/quantity.h"

namespace kneeprint {

class LogSweep {
 public:
  /// Rises over the first octave and falls from `fall` to `stop`, both by smooth_step over time.
  /// 0 < start, 2 start <= fall < stop, duration > 0; else std::invalid_argument (a programming
  /// error).
  LogSweep(Hertz start, Hertz fall, Hertz stop, Seconds duration);

  Hertz start() const { return start_; }
  Hertz stop() const { return stop_; }
  Seconds duration() const { return duration_; }
  /// L: the time in which the frequency grows by e.
  Seconds growth() const { return growth_; }
  /// Radians at `t` after the start.
  double phase(Seconds t) const;
  /// When the instantaneous frequency is `f`; negative below the start.
  Seconds time_of(Hertz f) const;
  /// L ln n: by how much the n-th harmonic's impulse response stands before the first's.
  Seconds lead(int order) const;

  /// Peak 1, from t = 0 to the end of the fall. stop < rate / 2.
  std::vector<double> samples(Hertz rate) const;

  /// One over the spectrum of the sampled sweep as it would be without its fades: bins 0 .. size/2
  /// of a transform of `size` samples. Multiplied with the spectrum of a response and transformed
  /// back, it leaves the impulse responses of all orders, order n at -L ln n (circularly), as gains
  /// against the sweep's peak. Zero below half the start frequency and at half the rate.
  /// The infinite sweep's spectrum is a Gamma function of imaginary argument (Mellin transform of
  /// exp(j a u)); Stirling's series (DLMF 5.11.1) gives
  ///   X(f) = 1/2 sqrt(L/f) exp j(s (1 - ln(f/f1)) + pi/4 + 1/(12 s) + 1/(360 s^3)),  s = 2 pi f L,
  /// whose first terms are the stationary-phase form of Novak, Lotton & Simon 2015; the last two
  /// are 0.03 degrees at 50 Hz and L = 0.6 s.
  std::vector<std::complex<double>> inverse_spectrum(Hertz rate, std::size_t size) const;

 private:
  Hertz start_, fall_, stop_;
  Seconds duration_, growth_;
};

}  // namespace kneeprint
