// SPDX-License-Identifier: GPL-3.0-or-later
// Gaussian noise of a known spectrum, and bounds for how often intervals cover.
#pragma once

#include <boost/math/distributions/binomial.hpp>
#include <cmath>
#include <complex>
#include <functional>
#include <numbers>
#include <random>
#include <vector>

#include "quantity/uncertain.h"
#include "signal/fft.h"
#include "signal/waveform.h"

namespace kneeprint::testing {

inline const Hertz kNoiseRate(4000.0);

class NoiseMaker {
 public:
  explicit NoiseMaker(unsigned seed) : random_(seed) {}

  /// One-sided density `shape(f)` per hertz above 1 Hz, `seconds` long: the middle of a periodic
  /// noise twice as long, so that its ends do not meet.
  Waveform noise(const std::function<double(double)>& shape, double seconds) {
    const std::size_t size = fast_length(2 * samples_in(Seconds(seconds), kNoiseRate));
    const double width = kNoiseRate.value() / static_cast<double>(size);
    std::vector<std::complex<double>> spectrum(size / 2 + 1, 0.0);
    for (std::size_t k = 1; k + 1 < spectrum.size(); ++k) {
      const double f = static_cast<double>(k) * width;
      if (f < 1.0) continue;
      // A line of peak a has mean square a^2 / 2; here E|z|^2 of the spectrum is (N a / 2)^2.
      const double sigma = 0.5 * static_cast<double>(size) * std::sqrt(shape(f) * width);
      spectrum[k] = {sigma * normal_(random_), sigma * normal_(random_)};
    }
    Waveform w{kNoiseRate, inverse_fft(spectrum, size)};
    w.samples.resize(samples_in(Seconds(seconds), kNoiseRate));
    return w;
  }
  double phase() {
    return std::uniform_real_distribution<double>(0.0, 2.0 * std::numbers::pi)(random_);
  }

 private:
  std::mt19937_64 random_;
  std::normal_distribution<double> normal_;
};

inline bool covers(const Uncertain& x, double truth) {
  return std::abs(x.value - truth) <= expanded_95(x);
}

/// Successes of `n` trials at probability p that are undercut with the chance given.
inline int fewest(int n, double p, double chance) {
  return static_cast<int>(boost::math::quantile(boost::math::binomial(n, p), chance));
}
/// ... and exceeded.
inline int most(int n, double p, double chance) {
  return static_cast<int>(
      boost::math::quantile(boost::math::complement(boost::math::binomial(n, p), chance)));
}

}  // namespace kneeprint::testing
