// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/diode.h"

#include <doctest/doctest.h>

#include <cmath>
#include <complex>
#include <numbers>
#include <vector>

#include "unit/harmonics.h"

using kneeprint::DiodeUnit;
using kneeprint::Hertz;

namespace {

// Last of several periods of a cosine.
std::vector<double> settled(double rate, std::size_t period, double peak, int cycles) {
  DiodeUnit unit{Hertz(rate)};
  std::vector<double> x(period);
  for (int cycle = 0; cycle < cycles; ++cycle) {
    for (std::size_t n = 0; n < period; ++n) {
      x[n] = peak * std::cos(2.0 * std::numbers::pi * static_cast<double>(n) /
                             static_cast<double>(period));
    }
    unit.process(x);
  }
  return x;
}

}  // namespace

TEST_CASE("at low frequency the unit is the static clipper of the reference values") {
  // Reference values 13.2, A = 1 V behind the pad. At 5 Hz the capacitor's current is a
  // ten-thousandth of the resistor's: harmonics move in quadrature, real parts by its square.
  const double expected[] = {0.6031936131,  -0.1104861253, 0.0264343443,
                             -0.0017517263, -0.0039811757, 0.0034191634};
  const auto x = settled(100000.0, 20000, 1.0 / DiodeUnit::kPad, 2);
  for (std::size_t k = 0; k < 6; ++k) {
    CHECK(std::fabs(line(x, 2 * k + 1).real() / DiodeUnit::kMakeUp - expected[k]) < 1e-6);
  }
}

TEST_CASE("small signals see the resistor-capacitor low-pass") {
  const double rate = 48000.0 * 32;
  const std::size_t period = 308;  // 4987 Hz
  const auto x = settled(rate, period, 1e-3, 20);
  const double w = 2.0 * std::numbers::pi * rate / static_cast<double>(period);
  // The diodes' own conductance at 0 V, 2 Is/(n Vt), is in parallel.
  const double conductance = 2.0 * 2.52e-9 / 0.045315349978;
  const std::complex<double> expected =
      1.0 /
      (1.0 + DiodeUnit::kSeriesOhms * std::complex<double>(conductance, w * DiodeUnit::kFarads));
  // BDF2 at 308 samples a period: (w T)^2/3 = 1.4e-4 of the capacitor's 0.15.
  CHECK(std::abs(line(x, 1) / 1e-3 - expected) < 3e-5);
}

TEST_CASE("hot drive: the step size has little to say") {
  const double rate = 48000.0 * 32;
  const auto coarse = settled(rate, 308, 17.36, 20);
  const auto fine = settled(16.0 * rate, 308 * 16, 17.36, 20);
  for (std::size_t n = 1; n < 12; n += 2) {
    // Second order: 16 times finer is 256 times nearer, so this is the error itself.
    CHECK(std::abs(line(coarse, n) - line(fine, n)) < 2e-3 * std::abs(line(fine, 1)));
  }
}
