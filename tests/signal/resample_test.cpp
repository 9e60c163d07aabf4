// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/resample.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <numbers>
#include <stdexcept>

namespace kneeprint {
namespace {

constexpr double kWanted = 1e-7;  // -140 dB of full scale

// A full-scale tone; `frequency` in Nyquist rates.
double tone(double frequency, double position) {
  return std::sin(std::numbers::pi * frequency * position + 0.7);
}

std::vector<double> tones(double frequency, std::size_t size) {
  std::vector<double> x(size);
  for (std::size_t n = 0; n < size; ++n) x[n] = tone(frequency, static_cast<double>(n));
  return x;
}

// Largest error against the tone itself, away from the signal's ends.
double worst_error(double frequency, double start, double step) {
  constexpr std::size_t kCount = 3000;
  const auto size = static_cast<std::size_t>(start + step * kCount) + 200;
  const std::vector<double> y = read_at(tones(frequency, size), start, step, kCount);
  double worst = 0.0;
  for (std::size_t n = 0; n < kCount; ++n) {
    worst =
        std::max(worst, std::abs(y[n] - tone(frequency, start + step * static_cast<double>(n))));
  }
  return worst;
}

}  // namespace

TEST_CASE("tones up to 0.907 of the lower Nyquist rate are read to -140 dB") {
  // Clock drift; 44.1 kHz recordings of 48 kHz reels and the reverse; both rates of 96 kHz.
  for (const double step : {1.0, 1.00012, 0.99988, 44100.0 / 48000, 48000.0 / 44100,
                            1.0884 * 1.0002, 0.5, 0.459375, 2.0, 1.2}) {
    CAPTURE(step);
    const double highest = 0.907 / std::max(1.0, step);
    double worst = 0.0;
    for (int i = 0; i <= 40; ++i) {
      worst = std::max(worst, worst_error(highest * i / 40, 200.3 + 0.017 * i, step));
    }
    CHECK(worst < kWanted);
  }
}

TEST_CASE("a slower reading lets nothing fold") {
  for (const double step : {1.2, 48000.0 / 44100, 2.0, 4.0}) {
    CAPTURE(step);
    for (double frequency = 1.094 / step; frequency < 1.0; frequency += 0.013) {
      const std::vector<double> y = read_at(tones(frequency, 20000), 600.0, step, 2000);
      const auto [least, most] = std::ranges::minmax(y);
      CAPTURE(frequency);
      CHECK(std::max(-least, most) < kWanted);
    }
  }
}

TEST_CASE("uneven positions are read as well as even ones") {
  const std::vector<double> x = tones(0.9, 4000);
  std::vector<double> positions;
  for (int n = 0; n < 3000; ++n) {
    // 0.4 % of flutter, 40 samples of excursion.
    positions.push_back(500.0 + n + 40.0 * std::sin(1e-4 * n));
  }
  const std::vector<double> y = read_at(x, positions);
  REQUIRE(y.size() == positions.size());
  double worst = 0.0;
  for (std::size_t n = 0; n < y.size(); ++n) {
    worst = std::max(worst, std::abs(y[n] - tone(0.9, positions[n])));
  }
  CHECK(worst < kWanted);
  const std::vector<double> nowhere{-1e12, std::nan(""), 1e12, INFINITY};
  for (const double v : read_at(x, nowhere)) CHECK(v == 0.0);
}

TEST_CASE("far into a long signal the position keeps its precision") {
  CHECK(worst_error(0.9, 3'000'000.4321, 0.99997) < kWanted);
}

TEST_CASE("whole positions give the samples themselves") {
  const std::vector<double> x = tones(0.31, 1000);
  const std::vector<double> y = read_at(x, 0.0, 1.0, 1000);
  double worst = 0.0;
  for (std::size_t n = 0; n < x.size(); ++n) worst = std::max(worst, std::abs(x[n] - y[n]));
  CHECK(worst < 1e-14);  // rounding: the sinc is zero at every other sample
}

TEST_CASE("near the ends and outside, the signal is what silence around it makes it") {
  std::vector<double> x = tones(0.2, 300);
  // The same signal inside a longer one takes the other path through the same numbers.
  std::vector<double> padded(1300, 0.0);
  std::ranges::copy(x, padded.begin() + 500);
  const std::vector<double> edge = read_at(x, -80.25, 1.1, 450);
  const std::vector<double> inside = read_at(padded, 500 - 80.25, 1.1, 450);
  double worst = 0.0;
  for (std::size_t n = 0; n < edge.size(); ++n)
    worst = std::max(worst, std::abs(edge[n] - inside[n]));
  CHECK(worst < 1e-12);  // rounding in another order
  for (const double start : {-1e12, -700.0, 900.0, 1e12}) {
    for (const double v : read_at(x, start, 1.0, 10)) CHECK(v == 0.0);
  }
  for (const double v : read_at({}, 0.0, 1.0, 10)) CHECK(v == 0.0);
  CHECK(read_at(x, 0.0, 1.0, 0).empty());
}

TEST_CASE("steps outside the range and positions that are no numbers are refused") {
  const std::vector<double> x(10, 0.0);
  CHECK_THROWS_AS(read_at(x, 0.0, 0.0, 1), std::invalid_argument);
  CHECK_THROWS_AS(read_at(x, 0.0, -1.0, 1), std::invalid_argument);
  CHECK_THROWS_AS(read_at(x, 0.0, 8.01, 1), std::invalid_argument);
  CHECK_THROWS_AS(read_at(x, std::nan(""), 1.0, 1), std::invalid_argument);
  CHECK_THROWS_AS(read_at(x, 0.0, std::nan(""), 1), std::invalid_argument);
}

}  // namespace kneeprint
