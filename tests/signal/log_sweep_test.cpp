// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/log_sweep.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <complex>
#include <numbers>
#include <stdexcept>
#include <vector>

#include "signal/fft.h"

using namespace kneeprint;

namespace {

using Complex = std::complex<double>;

// ln Gamma by DLMF 5.5.1 (recurrence) from where Stirling's first terms are exact to 1e-14: the
// sweep's own series is used at small arguments, this one never.
Complex log_gamma(Complex z) {
  Complex product_log = 0.0;
  for (; z.real() < 60.0; z += 1.0) product_log += std::log(z);
  return (z - 0.5) * std::log(z) - z + 0.5 * std::log(2.0 * std::numbers::pi) + 1.0 / (12.0 * z) -
         1.0 / (360.0 * z * z * z) - product_log;
}

}  // namespace

TEST_CASE("growth and leads of an exponential sweep") {
  // L = T / ln(f2/f1), leads L ln n: computed at 50 digits for 10 Hz .. 40 kHz, 10 s, 96 kHz.
  const LogSweep sweep(Hertz(10.0), Hertz(35000.0), Hertz(40000.0), Seconds(10.0));
  CHECK(std::abs(sweep.growth().value() - 1.205683644772) < 1e-12);
  const double samples[] = {80228.7570,  127159.5714, 160457.5141, 186285.4050,
                            207388.3284, 225230.5959, 240686.2711, 254319.1427};
  for (int n = 2; n <= 9; ++n) {
    CHECK(std::abs(sweep.lead(n).value() * 96000.0 - samples[n - 2]) < 1e-4);
  }
  CHECK(sweep.lead(1).value() == 0.0);
  CHECK(sweep.time_of(Hertz(40000.0)).value() == doctest::Approx(10.0).epsilon(1e-14));
}

TEST_CASE("the n-th harmonic is the same sweep, earlier by its lead") {
  const LogSweep sweep(Hertz(10.0), Hertz(20000.0), Hertz(22000.0), Seconds(3.7));
  for (int n = 2; n <= 7; ++n) {
    for (double t = 0.0; t < 1.5; t += 0.0371) {
      const double harmonic = n * sweep.phase(Seconds(t));
      const double earlier = sweep.phase(Seconds(t) + sweep.lead(n));
      CHECK(earlier == doctest::Approx(harmonic).epsilon(1e-12));
    }
  }
}

TEST_CASE("samples: full level between the fades, silent at both ends, smooth") {
  const LogSweep sweep(Hertz(10.0), Hertz(22080.0), Hertz(23520.0), Seconds(5.0));
  const auto x = sweep.samples(Hertz(48000.0));
  REQUIRE(x.size() == 240000);
  CHECK(x.front() == 0.0);
  CHECK(std::abs(x.back()) < 1e-9);
  const auto at = [&](Hertz f) {
    return static_cast<std::size_t>(sweep.time_of(f).value() * 48000.0);
  };
  for (std::size_t n = at(Hertz(20.0)) + 1; n < at(Hertz(22080.0)); n += 97) {
    CHECK(std::abs(x[n] - std::cos(sweep.phase(Seconds(static_cast<double>(n) / 48000.0)))) <
          1e-12);
  }
  for (const double v : x) CHECK_FALSE(std::abs(v) > 1.0);
}

TEST_CASE("the inverse spectrum is one over the sweep's exact transform, a Gamma function") {
  // integral of exp(j a e^(t/L) - j w t) dt = L Gamma(-j s) a^(j s) e^(pi s / 2), s = w L,
  // a = 2 pi f1 L (DLMF 5.2.1, its path turned by a quarter).
  const LogSweep sweep(Hertz(10.0), Hertz(3000.0), Hertz(3900.0), Seconds(2.0));
  const double l = sweep.growth().value();
  const auto inverse = sweep.inverse_spectrum(Hertz(8000.0), 16000);
  for (const std::size_t k : {20u, 41u, 84u, 500u, 2000u, 7000u}) {
    const double f = 0.5 * static_cast<double>(k);
    const double s = 2.0 * std::numbers::pi * f * l;
    const Complex log_exact =
        std::log(l) + log_gamma({0.0, -s}) +
        Complex(std::numbers::pi * s / 2.0, s * std::log(2.0 * std::numbers::pi * 10.0 * l));
    // The real sweep holds half of it; 8000 samples stand for each second.
    const Complex product = inverse[k] * std::exp(log_exact) * 0.5 * 8000.0;
    CAPTURE(f);
    // The series' next term, and what rounding leaves of phases of up to 1e5 radians.
    CHECK(std::abs(product - 1.0) < 1.01 / (1260.0 * std::pow(s, 5)) + 1e-10);
  }
}

TEST_CASE(
    "a sweep times its inverse spectrum is a unit impulse: the fades do not colour the band") {
  const LogSweep sweep(Hertz(10.0), Hertz(7360.0), Hertz(7840.0), Seconds(5.0));
  const Hertz rate(16000.0);
  auto x = sweep.samples(rate);
  x.resize(90000, 0.0);
  const auto spectrum = forward_fft(x);
  const auto inverse = sweep.inverse_spectrum(rate, x.size());
  const double width = rate.value() / static_cast<double>(x.size());
  for (std::size_t k = 0; k < spectrum.size(); ++k) {
    const double f = static_cast<double>(k) * width;
    // Before any window: what is left of the fades' own edges, 92 dB down and falling.
    if (f > 60.0 && f < 7200.0) CHECK(std::abs(spectrum[k] * inverse[k] - 1.0) < 2e-5);
  }
  CHECK(std::abs(inverse[0]) == 0.0);
  CHECK(std::abs(inverse.back()) == 0.0);
}

TEST_CASE("impossible sweeps are refused") {
  const Hertz low(10.0), mid(1000.0), high(2000.0);
  CHECK_THROWS_AS(LogSweep(Hertz(0.0), mid, high, Seconds(1.0)), std::invalid_argument);
  CHECK_THROWS_AS(LogSweep(low, Hertz(15.0), high, Seconds(1.0)), std::invalid_argument);
  CHECK_THROWS_AS(LogSweep(low, high, mid, Seconds(1.0)), std::invalid_argument);
  CHECK_THROWS_AS(LogSweep(low, mid, high, Seconds(0.0)), std::invalid_argument);
}
