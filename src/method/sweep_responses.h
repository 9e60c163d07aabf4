// SPDX-License-Identifier: GPL-3.0-or-later
// The harmonic impulse responses of a swept take, windowed one by one, and their frequency
// responses (Farina 2000; Novak, Lotton & Simon 2015): one transform forward, one back.
#pragma once

#include <complex>
#include <span>
#include <vector>

#include "signal/fft.h"
#include "signal/log_sweep.h"

namespace kneeprint {

/// Some frequencies of one order, read through one window.
struct OrderResponse {
  /// Per fundamental asked for: the order's phasor (cosine reference) over the sweep's peak.
  std::vector<std::complex<double>> gain;
  /// Integral of the squared window over time: what lets noise in.
  Seconds window_energy{0.0};
};

class SweepResponses {
 public:
  /// `block`: one period of the response to a sweep that begins at its first sample (the mean of
  /// several, where there are).
  SweepResponses(const LogSweep& sweep, std::span<const double> block, Hertz rate);

  /// Order n at the fundamentals `f`, which lie within some third of an octave: the window is that
  /// of their middle. It begins 10 periods of the order's frequency (at least 8 ms and 384 samples)
  /// before the order's own instant and ends 20 periods (at least 20 ms and 960 samples) after it,
  /// but keeps clear of the neighbouring orders, and is flat between two smooth steps.
  OrderResponse read(int order, std::span<const Hertz> fundamentals) const;

  /// Periodic impulse response of all orders; order n at -L ln n.
  std::span<const double> impulse() const { return {impulse_.get(), size_}; }

 private:
  LogSweep sweep_;
  Hertz rate_;
  std::size_t size_;
  SampleBuffer impulse_;
};

}  // namespace kneeprint
