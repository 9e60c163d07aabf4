// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/weighting.h"

#include <doctest/doctest.h>

#include <array>
#include <cmath>
#include <numbers>
#include <random>

using namespace kneeprint;

namespace {

double db(std::complex<double> h) { return 20.0 * std::log10(std::abs(h)); }

constexpr double kNone = INFINITY;

// IEC 61672-1:2013: table 3 (A column and class 1 acceptance limits; the limits from memory) and
// Annex E's formula, evaluated to four decimals independently of the code. Frequencies are
// 10^(3 + k / 10) Hz, k = -20 .. 13.
struct ARow {
  double analytic, table, above, below;
};
constexpr ARow kA[] = {
    {-70.4304, -70.4, 3.0, kNone}, {-63.3711, -63.4, 2.5, kNone}, {-56.6881, -56.7, 2.0, 4.0},
    {-50.4522, -50.5, 2.0, 2.0},   {-44.7030, -44.7, 2.0, 1.5},   {-39.4400, -39.4, 1.5, 1.5},
    {-34.6303, -34.6, 1.0, 1.0},   {-30.2282, -30.2, 1.0, 1.0},   {-26.1943, -26.2, 1.0, 1.0},
    {-22.5038, -22.5, 1.0, 1.0},   {-19.1428, -19.1, 1.0, 1.0},   {-16.0984, -16.1, 1.0, 1.0},
    {-13.3503, -13.4, 1.0, 1.0},   {-10.8704, -10.9, 1.0, 1.0},   {-8.6303, -8.6, 1.0, 1.0},
    {-6.6110, -6.6, 1.0, 1.0},     {-4.8084, -4.8, 1.0, 1.0},     {-3.2327, -3.2, 1.0, 1.0},
    {-1.9005, -1.9, 1.0, 1.0},     {-0.8239, -0.8, 1.0, 1.0},     {0.0000, 0.0, 0.7, 0.7},
    {0.5912, 0.6, 1.0, 1.0},       {0.9807, 1.0, 1.0, 1.0},       {1.1999, 1.2, 1.0, 1.0},
    {1.2707, 1.3, 1.0, 1.0},       {1.1987, 1.2, 1.0, 1.0},       {0.9699, 1.0, 1.0, 1.0},
    {0.5487, 0.5, 1.5, 1.5},       {-0.1212, -0.1, 1.5, 2.0},     {-1.1107, -1.1, 1.5, 2.5},
    {-2.4918, -2.5, 2.0, 3.0},     {-4.3175, -4.3, 2.0, 5.0},     {-6.6026, -6.6, 2.5, 16.0},
    {-9.3169, -9.3, 3.0, kNone}};

// ITU-R BS.468-4 table 1 with its tolerances (these from memory), and the rational form evaluated
// independently to three decimals.
struct ItuRow {
  double hz, table, tolerance, rational;
};
constexpr ItuRow kItu[] = {
    {31.5, -29.9, 2.00, -29.883},  {63, -23.9, 1.40, -23.862},    {100, -19.8, 1.00, -19.850},
    {200, -13.8, 0.85, -13.834},   {400, -7.8, 0.70, -7.833},     {800, -1.9, 0.55, -1.885},
    {1000, 0.0, 0.50, 0.000},      {2000, 5.6, 0.50, 5.629},      {3150, 9.0, 0.50, 8.975},
    {4000, 10.5, 0.50, 10.537},    {5000, 11.7, 0.50, 11.707},    {6300, 12.2, 0.00, 12.217},
    {7100, 12.0, 0.20, 12.005},    {8000, 11.4, 0.40, 11.368},    {9000, 10.1, 0.60, 10.138},
    {10000, 8.1, 0.80, 8.135},     {12500, 0.0, 1.20, -0.015},    {14000, -5.3, 1.40, -5.316},
    {16000, -11.7, 1.60, -11.699}, {20000, -22.2, 2.00, -22.177}, {31500, -42.7, 2.80, -42.710}};

constexpr double kTableRounding = 0.05;  // both tables are printed in steps of 0.1 dB

Waveform white(std::size_t size, unsigned seed) {
  std::mt19937_64 random(seed);
  std::normal_distribution<double> noise;
  Waveform w{Hertz(48000.0), std::vector<double>(size)};
  for (double& x : w.samples) x = noise(random);
  return w;
}

}  // namespace

TEST_CASE("A weighting: Annex E to its last printed digit, table 3 within class 1") {
  for (int k = 0; k < static_cast<int>(std::size(kA)); ++k) {
    const double f = std::pow(10.0, 1.0 + 0.1 * k);
    CAPTURE(f);
    const ARow& row = kA[k];
    const double got = db(a_weighting(Hertz(f)));
    CHECK(std::abs(got - row.analytic) < 0.5e-4 + 1e-9);
    CHECK(std::abs(got - row.table) < kTableRounding + 1e-9);
    CHECK(got - row.table < row.above);
    CHECK(row.table - got < row.below);
  }
  CHECK(std::abs(db(a_weighting(Hertz(1000.0)))) < 1e-12);
}

TEST_CASE("A weighting: the closed magnitude formula, corners as the standard quotes them") {
  // IEC 61672-1 Annex E: R_A = f4^2 f^4 / ((f^2+f1^2) sqrt(f^2+f2^2) sqrt(f^2+f3^2) (f^2+f4^2)).
  const double f1 = 20.598997057618, f2 = 107.652648643046, f3 = 737.862230736290,
               f4 = 12194.217147998012;
  for (double f = 3.0; f < 40000.0; f *= 1.37) {
    const double r =
        f4 * f4 * std::pow(f, 4) /
        ((f * f + f1 * f1) * std::hypot(f, f2) * std::hypot(f, f3) * (f * f + f4 * f4));
    // -1.999655535667 dB: the same at 1 kHz. Twelve digits are given.
    CHECK(std::abs(db(a_weighting(Hertz(f))) - (20.0 * std::log10(r) + 1.999655535667)) < 1e-9);
  }
}

TEST_CASE("468 weighting: the Recommendation's table within its tolerances") {
  for (const ItuRow& row : kItu) {
    CAPTURE(row.hz);
    const double got = db(itu468_weighting(Hertz(row.hz)));
    CHECK(std::abs(got - row.rational) < 0.5e-3 + 1e-9);
    // 0.0502 dB at 100 Hz: the form itself lies that far from the printed -19.8.
    CHECK(std::abs(got - row.table) < kTableRounding + 0.5e-3);
    CHECK(std::abs(got - row.table) <= row.tolerance + kTableRounding);
  }
  CHECK(std::abs(db(itu468_weighting(Hertz(1000.0)))) < 1e-12);
}

TEST_CASE("468 weighting: the same network by its poles, phase included") {
  // Roots of the denominator, found independently (rad/s, four decimals), one zero at 0.
  using C = std::complex<double>;
  const std::array poles{C(-25903.7010, 0),          C(-62675.1701, 0),
                         C(-18743.7467, 62460.1565), C(-18743.7467, -62460.1565),
                         C(-23615.5352, 36379.9089), C(-23615.5352, -36379.9089)};
  const auto network = [&](double f) {
    const C s(0.0, 2.0 * std::numbers::pi * f);
    C h = s;
    for (const C& p : poles) h *= 1e4 / (s - p);
    return h;
  };
  const double gain = std::abs(network(1000.0));
  for (double f = 20.0; f < 32000.0; f *= 1.31) {
    const C ratio = network(f) / gain / itu468_weighting(Hertz(f));
    CHECK(std::abs(ratio - C(1.0, 0.0)) < 1e-6);  // poles are given to some 1e-9
  }
}

TEST_CASE("a sine through `weighted` is multiplied by the network's response") {
  const double rate = 48000.0;
  for (const double f : {60.0, 1000.0, 6300.0, 15000.0}) {
    for (const int oversampling : {1, 4}) {
      CAPTURE(f);
      CAPTURE(oversampling);
      Waveform w{Hertz(rate), std::vector<double>(48000)};
      for (std::size_t n = 0; n < w.samples.size(); ++n) {
        const double t = static_cast<double>(n) / rate;
        // Soft ends: a Hann window, 1 at the middle.
        w.samples[n] = 0.5 * (1.0 - std::cos(2.0 * std::numbers::pi * t)) *
                       std::cos(2.0 * std::numbers::pi * f * (t - 0.5));
      }
      const Waveform y = weighted(w, itu468_weighting, Hertz(20.0), Hertz(20000.0), oversampling);
      REQUIRE(y.samples.size() == w.samples.size() * static_cast<std::size_t>(oversampling));
      CHECK(y.rate.value() == rate * oversampling);
      const std::complex<double> h = itu468_weighting(Hertz(f));
      // The envelope's own bend (half of (2 pi)^2 / 2 per s^2) times the network's delay squared,
      // 1e-4 at 60 Hz where the phase turns fastest, bounds the difference from a steady sine.
      const double middle = y.samples[y.samples.size() / 2];
      CHECK(std::abs(middle - h.real()) < 1e-4 * std::abs(h) + 1e-9);
    }
  }
}

TEST_CASE("weighted white noise has the power of the response's integral") {
  const Waveform w = white(1u << 19, 7);
  const double rate = w.rate.value();
  const auto mean_square = [](const Waveform& y) {
    double sum = 0.0;
    for (const double v : y.samples) sum += v * v;
    return sum / static_cast<double>(y.samples.size());
  };
  for (const Weighting weighting : {flat_weighting, a_weighting, itu468_weighting}) {
    // Midpoint rule over 20 Hz .. 20 kHz; one-sided density 2 / rate of variance 1.
    double integral = 0.0, fourth = 0.0;
    constexpr double kStep = 0.5;
    for (double f = 20.0 + kStep / 2; f < 20000.0; f += kStep) {
      const double p = std::norm(weighting(Hertz(f)));
      integral += p * kStep;
      fourth += p * p * kStep;
    }
    const double expected = 2.0 / rate * integral;
    // var = (1/T) integral of G^2 (Bendat & Piersol, "Random Data", from memory); five sigma.
    const double sigma =
        2.0 / rate * std::sqrt(fourth / (static_cast<double>(w.samples.size()) / rate));
    const double got = mean_square(weighted(w, weighting, Hertz(20.0), Hertz(20000.0)));
    CHECK(std::abs(got - expected) < 5.0 * sigma);
    CHECK(mean_square(weighted(w, weighting, Hertz(20.0), Hertz(20000.0), 4)) ==
          doctest::Approx(got).epsilon(1e-3));  // the ends of what is padded, a few 1e-4
  }
}
