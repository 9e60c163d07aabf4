// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/mains_lines.h"

#include <doctest/doctest.h>

#include <cmath>
#include <numbers>

using namespace kneeprint;

namespace {

constexpr Hertz kRate(48000.0);
constexpr HoldLayout kHold{0, 48000, 4};

Waveform hum(double mains, std::initializer_list<int> orders) {
  Waveform w{kRate, std::vector<double>(kHold.end())};
  for (std::size_t n = 0; n < w.samples.size(); ++n) {
    const double t = static_cast<double>(n) / kRate.value();
    for (const int order : orders) {
      w.samples[n] += std::cos(2.0 * std::numbers::pi * order * mains * t + order);
    }
  }
  return w;
}

}  // namespace

TEST_CASE("leakage of lines that are off is known") {
  for (const double mains : {50.05, 49.97, 60.04}) {
    CAPTURE(mains);
    const BlockSpectra spectra(hum(mains, {1, 2, 3, 5}), kHold, 1);
    const MainsLines lines(spectra);
    for (int b = 0; b < kHold.blocks; ++b) {
      for (std::size_t k = 21; k < 400; ++k) {
        if (MainsLines::is_multiple(k)) continue;
        CAPTURE(k);
        const std::complex<double> there = spectra.at(b, k);
        REQUIRE(std::abs(there) > 1e-6);
        // The relaxation leaves some 10^-6 of a line of amplitude 1; leakage is 10^-4 and more.
        CHECK(std::abs(there - lines.leakage(b, k)) < 1e-6);
      }
    }
  }
}

TEST_CASE("lines that are not off leak nothing") {
  const BlockSpectra spectra(hum(50.0, {1, 2, 3, 6}), kHold, 1);
  const MainsLines lines(spectra);
  for (std::size_t k = 21; k < 400; ++k) {
    if (!MainsLines::is_multiple(k)) CHECK(std::abs(lines.leakage(1, k)) < 1e-9);
  }
}
