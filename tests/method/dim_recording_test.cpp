// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/dim_recording.h"

#include <doctest/doctest.h>

#include <cmath>
#include <numbers>
#include <random>

#include "method/dim_generator.h"
#include "quantity/failure.h"

using namespace kneeprint;
using Generator = kneeprint::testing::DimGenerator;

namespace {

Waveform noisy(Waveform w, double noise, unsigned seed) {
  std::mt19937_64 random(seed);
  std::normal_distribution<double> normal(0.0, noise);
  for (double& x : w.samples) x += normal(random);
  return w;
}

constexpr std::array<double, 9> kProducts{1e-3, 3e-4, 2e-3, 1e-4, 5e-4, 2.5e-4, 8e-5, 4e-4, 1.5e-4};

double root_sum(const std::array<double, 9>& a) {
  double sum = 0.0;
  for (const double x : a) sum += x * x;
  return std::sqrt(sum);
}

}  // namespace

TEST_CASE("products of a recorded generator at any rate and tuning") {
  struct Case {
    double rate, square, sine;
  };
  for (const Case& c : {Case{44100.0, 3150.0, 15000.0},
                        {48000.0, 3151.37, 14993.21},
                        {48000.0, 3180.0, 15000.0},
                        {96000.0, 3149.2, 15004.9}}) {
    CAPTURE(c.rate);
    CAPTURE(c.square);
    Generator g;
    g.square = c.square;
    g.sine = c.sine;
    g.products = kProducts;
    g.seconds = 2.7;
    const DimReading r = read_dim(g.at(Hertz(c.rate)), DimKind::dim30, "test");
    // Noise-free: what is left is the window's lobes, -180 dB of the square, and rounding.
    CHECK(std::abs(r.square_hz.value - c.square) < 1e-6);
    CHECK(std::abs(r.sine_hz.value - c.sine) < 1e-6);
    CHECK(r.square_over_sine.value == doctest::Approx(r.nominal_over_sine).epsilon(1e-6));
    for (std::size_t i = 0; i < 9; ++i) {
      CHECK(r.products[i].over_sine.ratio == doctest::Approx(kProducts[i]).epsilon(1e-4));
      CHECK(
          r.products[i].frequency.value() ==
          doctest::Approx(std::abs(c.sine - static_cast<double>(i + 1) * c.square)).epsilon(1e-6));
    }
    CHECK(r.figure.ratio == doctest::Approx(root_sum(kProducts)).epsilon(1e-4));
    CHECK(r.figure.flag == Flag::none);
    CHECK(r.start.value() > 0.7);
    CHECK_FALSE(r.clipped);
  }
}

TEST_CASE("a generator that drifts is followed") {
  Generator g;
  g.drift = 0.05;  // within a block of 0.5 s product 9 then moves by a tenth of a bin
  g.products = kProducts;
  const DimReading r = read_dim(g.at(Hertz(48000.0)), DimKind::dim30, "test");
  CHECK(r.square_hz.value == doctest::Approx(3150.0 + 0.05 * 2.5).epsilon(1e-5));
  CHECK(r.figure.ratio == doctest::Approx(root_sum(kProducts)).epsilon(1e-3));
}

TEST_CASE("a path without distortion reads nothing, with noise an upper limit") {
  Generator g;
  g.seconds = 2.7;
  const Waveform clean = g.at(Hertz(44100.0));
  CHECK(read_dim(clean, DimKind::dim30, "test").figure.ratio < 1e-7);
  int seen = 0;
  // 24 recordings: 5 is the 99.9 % point of the binomial with 5 %.
  for (unsigned seed = 1; seed <= 24; ++seed) {
    seen += read_dim(noisy(clean, 1e-3, seed), DimKind::dim30, "test").figure.flag != Flag::noise;
  }
  CHECK(seen <= 5);
}

TEST_CASE("the intervals of products and figure cover the truth") {
  Generator g;
  g.products = kProducts;
  g.seconds = 2.7;
  const Waveform clean = g.at(Hertz(44100.0));
  int covered = 0, figures = 0;
  constexpr int kRepeats = 24;
  for (unsigned seed = 1; seed <= kRepeats; ++seed) {
    // Each product's u is about 1e-5 of the sine.
    const DimReading r = read_dim(noisy(clean, 2e-4, seed), DimKind::dim30, "test");
    for (std::size_t i = 0; i < 9; ++i) {
      const RelativeReading& p = r.products[i].over_sine;
      covered += std::abs(p.ratio - kProducts[i]) <= coverage_factor_95(p.dof) * p.u;
    }
    figures += std::abs(r.figure.ratio - root_sum(kProducts)) <=
               coverage_factor_95(r.figure.dof) * r.figure.u;
  }
  // 99.9 % range of the binomial with 95 %: 193 .. 214 of 216, 18 and more of 24.
  MESSAGE(covered, " of 216 products, ", figures, " of 24 figures");
  CHECK(covered >= 193);
  CHECK(covered <= 214);
  CHECK(figures >= 18);
}

TEST_CASE("DIM 100 has its own nominal square") {
  Generator g;
  g.pole = kDim100Pole;
  g.products = kProducts;
  const DimReading r = read_dim(g.at(Hertz(48000.0)), DimKind::dim100, "test");
  CHECK(r.nominal_over_sine == doctest::Approx(4.0 * 1.272608328).epsilon(1e-8));
  CHECK(r.square_over_sine.value == doctest::Approx(r.nominal_over_sine).epsilon(1e-6));
}

TEST_CASE("rows of scalars.csv") {
  Generator g;
  g.products = kProducts;
  const auto rows = scalars_of(read_dim(g.at(Hertz(48000.0)), DimKind::dim30, "test"));
  REQUIRE(rows.size() == 14);
  CHECK(rows[0].method == "dim-30");
  CHECK(rows[0].figure == "dim");
  CHECK(*rows[0].value == doctest::Approx(100.0 * root_sum(kProducts)).epsilon(1e-4));
  CHECK(rows[5].state == "k5");
  CHECK(*rows[5].frequency_hz == doctest::Approx(750.0).epsilon(1e-6));
  CHECK(*rows[5].value == doctest::Approx(20.0 * std::log10(5e-4)).epsilon(1e-4));
  CHECK_FALSE(rows[0].drive.has_value());
}

TEST_CASE("what is no recording of a DIM generator is refused with the reason") {
  Generator g;
  CHECK_THROWS_AS(read_dim(g.at(Hertz(32000.0)), DimKind::dim30, "low.wav"), InputError);
  g.seconds = 1.5;
  CHECK_THROWS_WITH_AS(read_dim(g.at(Hertz(48000.0)), DimKind::dim30, "short.wav"),
                       doctest::Contains("short.wav: 1.40 s of steady signal"), InputError);
  g.seconds = 5.0;
  g.sine = 12000.0;
  CHECK_THROWS_WITH_AS(read_dim(g.at(Hertz(48000.0)), DimKind::dim30, "other.wav"),
                       doctest::Contains("no sine"), InputError);
  CHECK_THROWS_AS(read_dim({Hertz(48000.0), {}}, DimKind::dim30, "empty"), InputError);
  CHECK_THROWS_AS(read_dim({Hertz(48000.0), std::vector<double>(480000, 0.0)}, DimKind::dim30, "x"),
                  InputError);
}
