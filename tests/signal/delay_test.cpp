// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/delay.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <complex>
#include <numbers>
#include <random>
#include <stdexcept>

#include "signal/fft.h"

namespace kneeprint {
namespace {

std::vector<double> noise(std::size_t size, double rms, unsigned seed) {
  std::mt19937 random(seed);
  std::normal_distribution<double> normal(0.0, rms);
  std::vector<double> x(size);
  for (double& v : x) v = normal(random);
  return x;
}

// `x` in `size` samples of silence, delayed and scaled by the phase of its spectrum: exact for any
// fraction of a sample.
std::vector<double> delayed(const std::vector<double>& x, std::size_t size, double samples,
                            double gain) {
  std::vector<double> padded(size, 0.0);
  std::ranges::copy(x, padded.begin());
  auto spectrum = forward_fft(padded);
  for (std::size_t k = 0; k < spectrum.size(); ++k) {
    const double turns = samples * static_cast<double>(k) / static_cast<double>(size);
    spectrum[k] *= gain * std::polar(1.0, -2.0 * std::numbers::pi * (turns - std::floor(turns)));
  }
  if (size % 2 == 0) spectrum.back() = 0.0;  // the last bin of a real signal has no phase
  return inverse_fft(spectrum, size);
}

}  // namespace

TEST_CASE("clean broadband signals are placed far better than to 0.001 sample") {
  const std::vector<double> known = noise(4000, 0.3, 11);
  for (const double delay : {0.0, 1.0, 17.5, 100.25, 1234.4999, 2000.501, 3777.999, 4321.0123}) {
    for (const double gain : {1.0, -0.37, 1e-4}) {
      CAPTURE(delay);
      CAPTURE(gain);
      const Delay d = find_delay(known, delayed(known, 12001, delay, gain), 0, 6000);
      // The tails of fractional delays that the recording's ends cut off limit what can be known.
      CHECK(std::abs(d.samples - delay) < 1e-4);
      CHECK(std::abs(d.gain / gain - 1.0) < 1e-3);
      CHECK(d.match > 0.999);
    }
  }
}

TEST_CASE("a late place in a long recording keeps the same precision") {
  const std::vector<double> known = noise(12000, 0.1, 12);
  const double delay = 481'234.567;
  const Delay d = find_delay(known, delayed(known, 1 << 19, delay, 0.5), 0, 500'000);
  CHECK(std::abs(d.samples - delay) < 1e-4);
}

TEST_CASE("a recording that starts late gives a negative delay") {
  const std::vector<double> known = noise(3000, 0.3, 13);
  std::vector<double> recording = delayed(known, 8000, 0.25, 2.0);
  recording.erase(recording.begin(), recording.begin() + 40);
  const Delay d = find_delay(known, recording, -100, 100);
  CHECK(std::abs(d.samples + 39.75) < 0.001);
  CHECK(d.gain == doctest::Approx(2.0).epsilon(0.02));  // 40 of 3000 samples are missing
}

TEST_CASE("at 40 dB signal-to-noise the error stays under 0.01 sample") {
  const std::vector<double> known = noise(4000, 0.1, 14);
  for (unsigned seed = 0; seed < 20; ++seed) {
    const double delay = 500.0 + 0.37 * seed;
    std::vector<double> recording = delayed(known, 8192, delay, -1.0);
    const std::vector<double> hiss = noise(recording.size(), 0.001, 100 + seed);
    for (std::size_t n = 0; n < recording.size(); ++n) recording[n] += hiss[n];
    const Delay d = find_delay(known, recording, 0, 2000);
    // Standard error for white signals (Cramer-Rao): 0.01 / (sqrt(4000) pi / sqrt(3)) = 9e-5.
    CHECK(std::abs(d.samples - delay) < 0.001);
    CHECK(d.gain < 0.0);
  }
}

TEST_CASE("only the asked range is searched") {
  const std::vector<double> known = noise(500, 0.3, 15);
  std::vector<double> recording = delayed(known, 4000, 300.0, 1.0);
  const std::vector<double> weaker = delayed(known, 4000, 1500.0, 0.1);
  for (std::size_t n = 0; n < recording.size(); ++n) recording[n] += weaker[n];
  CHECK(find_delay(known, recording, 0, 3000).samples == doctest::Approx(300.0).epsilon(1e-4));
  CHECK(find_delay(known, recording, 1400, 1600).samples == doctest::Approx(1500.0).epsilon(1e-4));
}

TEST_CASE("the correlation is the sum that defines it, and nothing wraps round") {
  const std::vector<double> known = noise(7, 1.0, 16), recording = noise(12, 1.0, 17);
  const std::vector<double> r = cross_correlation(known, recording, -20, 20);
  REQUIRE(r.size() == 41);
  for (long m = -20; m <= 20; ++m) {
    double sum = 0.0;
    for (long n = 0; n < 7; ++n) {
      if (n + m >= 0 && n + m < 12) {
        sum += known[static_cast<std::size_t>(n)] * recording[static_cast<std::size_t>(n + m)];
      }
    }
    CHECK(std::abs(r[static_cast<std::size_t>(m + 20)] - sum) < 1e-13);
  }
}

TEST_CASE("silence matches nothing, and an impossible question is refused") {
  const std::vector<double> known = noise(100, 1.0, 18), silence(400, 0.0), nothing;
  const Delay d = find_delay(known, silence, 0, 300);
  CHECK(d.match == 0.0);
  CHECK(d.gain == 0.0);
  CHECK(find_delay(silence, known, 0, 300).match == 0.0);
  CHECK_THROWS_AS(find_delay(nothing, known, 0, 1), std::invalid_argument);
  CHECK_THROWS_AS(find_delay(known, nothing, 0, 1), std::invalid_argument);
  CHECK_THROWS_AS(find_delay(known, known, 2, 1), std::invalid_argument);
}

}  // namespace kneeprint
