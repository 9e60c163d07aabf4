// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/quasi_peak.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <numbers>
#include <random>
#include <vector>

#include "signal/weighting.h"

using namespace kneeprint;

namespace {

const Hertz kRate(192000.0);

// 5 kHz bursts of `length`, `per_second` of them, through the weighting network: the highest
// reading.
double highest_reading(double length, double total, double per_second = 0.0) {
  Waveform w{kRate, std::vector<double>(samples_in(Seconds(total), kRate))};
  for (std::size_t n = 0; n < w.samples.size(); ++n) {
    double t = static_cast<double>(n) / kRate.value() - 0.01;
    if (per_second > 0.0 && t > 0.0) t = std::fmod(t, 1.0 / per_second);
    if (t >= 0.0 && t < length) w.samples[n] = std::sin(2.0 * std::numbers::pi * 5000.0 * t);
  }
  QuasiPeakMeter meter(kRate);
  double highest = 0.0;
  for (const double x : weighted(w, itu468_weighting, Hertz(0.0), Hertz(90000.0)).samples) {
    highest = std::max(highest, meter.step(x));
  }
  return highest;
}

double steady_reading(double f, Hertz rate) {
  QuasiPeakMeter meter(rate);
  const auto size = samples_in(Seconds(4.0), rate);
  double sum = 0.0;
  for (std::size_t n = 0; n < size; ++n) {
    const double reading =
        meter.step(std::sin(2.0 * std::numbers::pi * f * static_cast<double>(n) / rate.value()));
    if (n >= size / 2) sum += reading;
  }
  return sum / static_cast<double>(size - size / 2);
}

}  // namespace

TEST_CASE("single bursts and repeated ones: ITU-R BS.468-4, tables 2 and 3 (from memory)") {
  struct Row {
    double ms, per_second, low, high;  // limits, per cent of the steady reading
  };
  // Single 5 kHz bursts of 1 .. 200 ms, then 5 ms bursts repeated.
  const Row rows[] = {{1, 0, 13.5, 21.4}, {2, 0, 22.4, 31.6}, {5, 0, 34, 46},   {10, 0, 41, 55},
                      {20, 0, 44, 60},    {50, 0, 50, 68},    {100, 0, 58, 78}, {200, 0, 68, 92},
                      {5, 2, 43, 53},     {5, 10, 72, 82},    {5, 100, 94, 100}};
  const double steady = highest_reading(10.0, 3.0);
  CHECK(20.0 * std::log10(steady / (std::abs(itu468_weighting(Hertz(5000.0))) / std::sqrt(2.0))) ==
        doctest::Approx(0.0).epsilon(0.02));
  for (const Row& row : rows) {
    CAPTURE(row.ms);
    CAPTURE(row.per_second);
    const double total = row.per_second > 0.0 ? 2.5 : 0.1 + 1e-3 * row.ms;
    const double percent = 100.0 * highest_reading(1e-3 * row.ms, total, row.per_second) / steady;
    CHECK(percent >= row.low);
    CHECK(percent <= row.high);
  }
}

TEST_CASE("a steady sine reads its rms, whatever its frequency and the rate") {
  for (const double rate : {176400.0, 192000.0}) {
    for (const double f : {100.0, 1000.0, 5000.0, 10000.0}) {
      CAPTURE(rate);
      CAPTURE(f);
      // 0.02 dB: samples miss crests by up to 1 - cos(pi f / rate), averaged over cycles; at
      // 100 Hz the charge sags between crests by 1 - exp(-5 ms / 240 ms), of which half shows.
      const double tolerance = f < 500.0 ? 0.2 : 0.02;
      CHECK(std::abs(20.0 * std::log10(steady_reading(f, Hertz(rate)) * std::sqrt(2.0))) <
            tolerance);
    }
  }
}

TEST_CASE("the reading is proportional to the signal") {
  QuasiPeakMeter one(kRate), three(kRate);
  std::mt19937_64 random(3);
  std::normal_distribution<double> noise;
  double worst = 0.0;
  for (int n = 0; n < 20000; ++n) {
    const double x = noise(random);
    const double y = one.step(x);
    worst = std::max(worst, std::abs(three.step(-3.0 * x) - 3.0 * y) / y);
  }
  CHECK(worst < 1e-12);
}
