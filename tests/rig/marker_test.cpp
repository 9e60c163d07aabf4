// SPDX-License-Identifier: GPL-3.0-or-later
#include "rig/marker.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <numbers>
#include <random>

namespace kneeprint {
namespace {

constexpr Hertz kRate{48000.0};

// A marker that starts at `start`, between samples, in `size` samples.
std::vector<double> with_marker(const Marker& marker, double start, double gain, std::size_t size) {
  std::vector<double> x(size);
  for (std::size_t n = 0; n < size; ++n) {
    x[n] = gain * marker.at((static_cast<double>(n) - start) * period(kRate));
  }
  return x;
}

long crossings(const std::vector<double>& x, std::size_t from, std::size_t to) {
  long count = 0;
  for (std::size_t n = from + 1; n < to; ++n) count += (x[n] > 0.0) != (x[n - 1] > 0.0);
  return count;
}

}  // namespace

TEST_CASE("one marker sweeps from 300 Hz to 6 kHz, the other is its mirror image") {
  const Marker rising(Sweep::rising, kRate), falling(Sweep::falling, kRate);
  const std::vector<double> up = rising.samples(kRate), down = falling.samples(kRate);
  REQUIRE(up.size() == 12001);
  double worst = 0.0;
  for (std::size_t n = 0; n < up.size(); ++n) {
    worst = std::max(worst, std::abs(up[n] - down[up.size() - 1 - n]));
  }
  CHECK(worst < 1e-11);  // rounding of phases of up to 5000 rad
  CHECK(up.front() == 0.0);
  CHECK(up.back() == 0.0);
  CHECK(*std::ranges::max_element(up) <= 1.0);
  CHECK(*std::ranges::max_element(up) > 0.999);
  // A linear sweep has (300 + 6000) / 2 * 0.25 = 787.5 cycles; in the first fifth, 300 to 1440 Hz,
  // 43.5. Two crossings of zero each.
  CHECK(std::abs(crossings(up, 0, up.size()) - 1575) <= 2);
  CHECK(std::abs(crossings(up, 0, 2400) - 87) <= 2);
  CHECK(rising.at(Seconds(-0.001)) == 0.0);
  CHECK(rising.at(Seconds(0.2501)) == 0.0);
  CHECK(Marker(Sweep::rising, Hertz(8000.0)).highest() == Hertz(3200.0));
}

TEST_CASE("a marker is placed to 0.01 sample with its gain, and not taken for the other") {
  const Marker rising(Sweep::rising, kRate), falling(Sweep::falling, kRate);
  for (const double start : {-0.25, 0.0, 100.5, 25'000.123, 87'000.75}) {
    CAPTURE(start);
    const std::vector<double> x = with_marker(rising, start, -0.02, 100'000);
    const MarkerFound found = find_marker(rising, x, kRate, 0, 100'000);
    CHECK(found.clear());
    CHECK(std::abs(found.start - start) < 0.01);
    CHECK(found.gain == doctest::Approx(-0.02).epsilon(0.01));
    CHECK(found.match > 0.999);
    CHECK(!find_marker(falling, x, kRate, 0, 100'000).clear());
  }
}

TEST_CASE("the first of two is found, across the pieces of a long search, and only where asked") {
  const Marker marker(Sweep::rising, kRate);
  const double first = (1 << 19) - 0.5,
               second = 900'000.25;  // one ends a piece and starts the next
  std::vector<double> x = with_marker(marker, first, 0.01, 1'000'000);
  const std::vector<double> louder = with_marker(marker, second, 1.0, x.size());
  for (std::size_t n = 0; n < x.size(); ++n) x[n] += louder[n];
  CHECK(std::abs(find_marker(marker, x, kRate, 0, 1'000'000).start - first) < 0.01);
  CHECK(std::abs(find_marker(marker, x, kRate, 600'000, 1'000'000).start - second) < 0.01);
  CHECK(!find_marker(marker, x, kRate, 560'000, 880'000).clear());
  CHECK(!find_marker(marker, x, kRate, 900'010, 1'000'000).clear());
}

TEST_CASE("a marker at another speed, or bent by flutter, is found with its speed") {
  const Marker rising(Sweep::rising, kRate), falling(Sweep::falling, kRate);
  for (const double speed : {0.99, 0.9937, 0.998, 1.0, 1.0015, 1.006, 1.01}) {
    CAPTURE(speed);
    for (const Marker& marker : {rising, falling}) {
      std::vector<double> x(60'000);
      for (std::size_t n = 0; n < x.size(); ++n) {
        x[n] = 0.1 * marker.at(speed * (static_cast<double>(n) - 30'000.3) * period(kRate));
      }
      const MarkerFound found = find_marker(marker, x, kRate, 0, 60'000, 0.0125);
      CHECK(found.clear());
      CHECK(found.match > 0.99);
      CHECK(std::abs(found.speed - speed) < 1e-4);
      // Slower by q it ends 0.25 s q later; found by q amiss, half as far off.
      CHECK(std::abs(found.start - 30'000.3) < 1.0);
    }
  }
  for (const double flutter_hz : {0.5, 2.0, 5.0, 10.0}) {
    for (const double phase : {0.0, 1.0, 2.0, 3.0}) {
      CAPTURE(flutter_hz);
      CAPTURE(phase);
      const double turn = 2.0 * std::numbers::pi * flutter_hz;
      std::vector<double> x(60'000);
      for (std::size_t n = 0; n < x.size(); ++n) {
        const double t = 1.008 * (static_cast<double>(n) - 30'000.0) / kRate.value();
        x[n] = 0.1 * rising.at(Seconds(t + 0.002 / turn * std::sin(turn * t + phase)));
      }
      const MarkerFound found = find_marker(rising, x, kRate, 0, 60'000, 0.0125);
      CHECK(found.clear());
      // The flutter's excursion of up to 0.64 ms, and what its speed makes of a sweep's time: the
      // 10 ms of steady tone around a hold bear a tenth of that.
      CHECK(std::abs(found.start - 30'000.0) < 48.0);
    }
  }
}

TEST_CASE("noise alone stays far from clear over a million lags") {
  std::mt19937 random(5);
  std::normal_distribution<double> normal(0.0, 0.2);
  std::vector<double> x(1'000'000);
  for (double& v : x) v = normal(random);
  // Expected largest of a million: 4.9 standard deviations of 1 / sqrt(2850).
  CHECK(find_marker(Marker(Sweep::rising, kRate), x, kRate, 0, 1'000'000).match < 0.15);
}

}  // namespace kneeprint
