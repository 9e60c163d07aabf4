// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/smooth_step.h"

#include <doctest/doctest.h>

#include <cmath>
#include <complex>
#include <numbers>
#include <vector>

using namespace kneeprint;

TEST_CASE("a smooth step rises from 0 to 1, symmetric about its middle") {
  CHECK(smooth_step(-0.1) == 0.0);
  CHECK(smooth_step(0.0) == 0.0);
  CHECK(smooth_step(1.0) == 1.0);
  CHECK(smooth_step(7.0) == 1.0);
  CHECK(smooth_step(0.5) == doctest::Approx(0.5).epsilon(1e-15));
  double before = 0.0;
  for (double x = 0.001; x < 1.0; x += 0.001) {
    CHECK(smooth_step(x) >= before);
    before = smooth_step(x);
    CHECK(std::abs(smooth_step(x) + smooth_step(1.0 - x) - 1.0) < 1e-15);
  }
}

TEST_CASE("the slope of a smooth step is 92 dB down from four periods on (Harris 1978)") {
  constexpr int kSize = 20000;
  for (double periods = 4.0; periods < 40.0; periods += 0.37) {
    std::complex<double> sum = 0.0;
    for (int i = 0; i < kSize; ++i) {
      const double slope = smooth_step((i + 1.0) / kSize) - smooth_step(double(i) / kSize);
      sum += slope * std::polar(1.0, -2.0 * std::numbers::pi * periods * (i + 0.5) / kSize);
    }
    CHECK(20.0 * std::log10(std::abs(sum)) < -92.0);
  }
}

TEST_CASE("applied to samples by recurrence: the same as one by one, rising or falling") {
  for (const double dx : {1.0 / 5000.3, -1.0 / 777.7, 0.3}) {
    std::vector<double> samples(9000, 2.0);
    const double start = dx > 0.0 ? -0.2 : 3.1;
    apply_smooth_step(samples, start, dx);
    for (std::size_t i = 0; i < samples.size(); ++i) {
      const double expected = 2.0 * smooth_step(start + static_cast<double>(i) * dx);
      CHECK(std::abs(samples[i] - expected) < 1e-12);
    }
  }
  std::vector<double> none;
  apply_smooth_step(none, 0.0, 1.0);
  CHECK(none.empty());
}
