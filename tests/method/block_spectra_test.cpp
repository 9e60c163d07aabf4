// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/block_spectra.h"

#include <doctest/doctest.h>

#include <boost/math/distributions/non_central_chi_squared.hpp>
#include <cmath>
#include <numbers>
#include <random>

using namespace kneeprint;

namespace {

// Two cosines, an offset and noise in three blocks of 1000 samples that begin at an odd place.
constexpr HoldLayout kHold{37, 1000, 3};

Waveform take() {
  Waveform w{Hertz(48000.0), std::vector<double>(3100)};
  std::mt19937_64 random(11);
  std::normal_distribution<double> noise(0.0, 1e-3);
  for (std::size_t n = 0; n < w.samples.size(); ++n) {
    const double t = 2.0 * std::numbers::pi * (static_cast<double>(n) - 37.0) / 1000.0;
    w.samples[n] = 0.25 + 0.5 * std::cos(20.0 * t + 0.3) + 0.1 * std::cos(60.0 * t) + noise(random);
  }
  return w;
}

}  // namespace

TEST_CASE("lines are peak amplitudes with their phases, bin 0 is the mean") {
  const BlockSpectra spectra(take(), kHold, 20);
  CHECK(spectra.blocks() == 3);
  CHECK(spectra.bins() == 501);
  CHECK(spectra.bin_width() == doctest::Approx(48.0));
  for (int b = 0; b < 3; ++b) {
    // Noise of 1e-3 over 1000 samples leaves 4.5e-5 per component; five of them.
    CHECK(std::abs(spectra.at(b, 0) - 0.25) < 2.3e-4);
    CHECK(std::abs(spectra.at(b, 20) - std::polar(0.5, 0.3)) < 2.3e-4);
    CHECK(std::abs(spectra.at(b, 60) - 0.1) < 2.3e-4);
  }
}

TEST_CASE("the power of a band is the mean square of its lines, whole and in parts (Parseval)") {
  const Waveform w = take();
  const BlockSpectra spectra(w, kHold, 20);
  for (int b = 0; b < 3; ++b) {
    double mean = 0.0, square = 0.0;
    for (std::size_t n = 0; n < 1000; ++n) {
      const double x = w.samples[37 + 1000 * static_cast<std::size_t>(b) + n];
      mean += x / 1000.0;
      square += x * x / 1000.0;
    }
    // Every line counts half its squared amplitude; the mean's own square is twice that, and the
    // line at half the rate (one component, its amplitude doubled) a quarter.
    const double line_at_nyquist = std::norm(spectra.at(b, 500));
    CHECK(spectra.band_power(b, 0, 1000) ==
          doctest::Approx(square - 0.5 * mean * mean + 0.25 * line_at_nyquist).epsilon(1e-12));
    for (const std::size_t high : {19, 20, 21, 22, 23, 24, 499}) {
      double sum = 0.0;
      for (std::size_t k = 19; k <= high; ++k) sum += 0.5 * std::norm(spectra.at(b, k));
      CHECK(spectra.band_power(b, 19, high) == doctest::Approx(sum).epsilon(1e-13));
    }
  }
}

TEST_CASE("the noise around a line leaves the lines of the stride out") {
  const BlockSpectra spectra(take(), kHold, 20);
  const double expected = 1e-3 * std::sqrt(2.0 / 1000.0);  // per component of a line
  for (const std::size_t bin : {0, 1, 20, 30, 60, 400, 499}) {
    CAPTURE(bin);
    const BlockSpectra::Noise noise = spectra.noise_around(bin, 0);
    // The median of 72 and more exponential variates: 1 / sqrt(0.48 * 72) = 17 % of a power, so 9 %
    // of its root; four of that. A line of 0.1 among them would show as more than twice.
    CHECK(noise.sigma == doctest::Approx(expected).epsilon(0.35));
    CHECK(noise.dof > 60.0);
  }
}

TEST_CASE("the upper limit of an amplitude is the non-centrality that Boost finds, to 1e-12") {
  const double least = noise_threshold(1.0);
  for (double read = 0.0; read < 120.0; read = 1.05 * read + 0.01) {
    CAPTURE(read);
    double expected = least;
    // At or under the 2.5 % point of noise alone no amplitude satisfies the condition.
    if (read * read > -2.0 * std::log(0.975) * (1.0 + 1e-9)) {
      expected =
          std::max(least, std::sqrt(boost::math::non_central_chi_squared::find_non_centrality(
                              2.0, read * read, 0.025)));
    }
    CHECK(amplitude_upper_limit(3.0 * read, 3.0) == doctest::Approx(3.0 * expected).epsilon(1e-12));
  }
}

TEST_CASE("far above the noise the upper limit is the normal distribution's") {
  // A Rice variate of amplitude nu has the mean nu + 1 / (2 nu) and nearly unit variance (Rice
  // 1944, from memory), so 2.5 % lie below nu - 1.9599640 + 1 / (2 nu); the next term is of order 1
  // / nu^2.
  for (const double read : {1e3, 1e5, 1e9, 1e13}) {
    CAPTURE(read);
    const double expected = read + 1.959963984540054 - 0.5 / read;
    CHECK(std::abs(amplitude_upper_limit(read, 1.0) - expected) <
          2.0 / (read * read) + 4e-16 * read);
  }
}
