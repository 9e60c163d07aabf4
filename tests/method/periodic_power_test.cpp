// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/periodic_power.h"

#include <doctest/doctest.h>

#include <array>
#include <boost/math/distributions/binomial.hpp>
#include <cmath>
#include <random>
#include <vector>

using namespace kneeprint;

namespace {

constexpr int kBlocks = 3;

// `count` bins of periodic amplitude `amplitude` under complex noise of `sigma` per component.
PeriodicPower drawn(int count, double amplitude, double sigma, std::mt19937_64& random) {
  std::normal_distribution<double> noise(0.0, sigma);
  PeriodicPower power;
  for (int k = 0; k < count; ++k) {
    std::array<std::complex<double>, kBlocks> bin;
    for (auto& z : bin) {
      const double re = amplitude + noise(random);
      z = {re, noise(random)};
    }
    power.add(bin);
  }
  power.close_group();
  return power;
}

// Counts out of `n` that a right program with chance `p` leaves with probability 0.1 % at most, on
// either side.
bool plausible(int hits, int n, double p) {
  const boost::math::binomial b(n, p);
  return boost::math::cdf(b, hits) > 0.0005 &&
         boost::math::cdf(boost::math::complement(b, hits - 1)) > 0.0005;
}

}  // namespace

TEST_CASE("by hand: two bins, two blocks") {
  // Means 3 and 1, half differences 1 and 0: raw (9 + 1) / 2 = 5, scatter of the first bin
  // 2 / (2 * 1) = 1 per component, half of it in the mean's power: 1 / 2.
  PeriodicPower p;
  p.add(std::array<std::complex<double>, 2>{2.0, 4.0});
  p.add(std::array<std::complex<double>, 2>{1.0, 1.0});
  p.close_group();
  CHECK(p.periodic().value == doctest::Approx(4.5));
  CHECK(p.noise().value == doctest::Approx(1.0));
  // Mean of the blocks' powers: ((4 + 1) + (16 + 1)) / 2 / 2.
  CHECK(p.total().value == doctest::Approx(5.5));
}

TEST_CASE("without noise the periodic part is all there is, and certain") {
  PeriodicPower p;
  p.add(std::array<std::complex<double>, 3>{0.25, 0.25, 0.25});
  p.close_group();
  CHECK(p.periodic().value == doctest::Approx(0.03125));
  CHECK(p.periodic().u == 0.0);
  CHECK(p.noise().value == 0.0);
  CHECK(p.seen(1e-6));
  PeriodicPower nothing;
  nothing.add(std::array<std::complex<double>, 3>{});
  nothing.close_group();
  CHECK_FALSE(nothing.seen(0.05));
  CHECK(nothing.upper_limit() == 0.0);
  CHECK_FALSE(in_decibels(nothing.periodic(), {1.0}).db);
}

TEST_CASE("Monte Carlo: unbiased, and the stated uncertainty is the scatter") {
  std::mt19937_64 random(11);
  constexpr int kRepeats = 2000, kBins = 60;
  for (const double amplitude : {0.0, 0.5, 3.0}) {
    CAPTURE(amplitude);
    const double truth = kBins * amplitude * amplitude / 2.0;
    double sum = 0.0, squares = 0.0, stated = 0.0, noise = 0.0, noise_squares = 0.0,
           noise_stated = 0.0, total = 0.0, total_squares = 0.0, total_stated = 0.0;
    for (int r = 0; r < kRepeats; ++r) {
      const PeriodicPower p = drawn(kBins, amplitude, 1.0, random);
      const double e = p.periodic().value - truth;
      sum += e, squares += e * e, stated += std::pow(p.periodic().u, 2);
      const double n = p.noise().value - kBins;
      noise += n, noise_squares += n * n, noise_stated += std::pow(p.noise().u, 2);
      const double t = p.total().value - truth - kBins;
      total += t, total_squares += t * t, total_stated += std::pow(p.total().u, 2);
    }
    // Means within 3.5 standard errors; the ratio of variances has a relative standard error of
    // sqrt(2 / 2000) = 3.2 %, so 12 % is 3.8 of them.
    CHECK(std::abs(sum) < 3.5 * std::sqrt(squares));
    CHECK(std::abs(noise) < 3.5 * std::sqrt(noise_squares));
    CHECK(std::abs(total) < 3.5 * std::sqrt(total_squares));
    CHECK(squares / stated == doctest::Approx(1.0).epsilon(0.12));
    CHECK(noise_squares / noise_stated == doctest::Approx(1.0).epsilon(0.12));
    CHECK(total_squares / total_stated == doctest::Approx(1.0).epsilon(0.12));
  }
}

TEST_CASE("Monte Carlo: noise is taken for distortion as often as stated") {
  std::mt19937_64 random(12);
  constexpr int kRepeats = 2000;
  int often = 0, rarely = 0;
  for (int r = 0; r < kRepeats; ++r) {
    const PeriodicPower p = drawn(30, 0.0, 1.0, random);
    often += p.seen(0.05);
    rarely += p.seen(0.00125);
  }
  CHECK(plausible(often, kRepeats, 0.05));
  CHECK(plausible(rarely, kRepeats, 0.00125));
}

TEST_CASE("Monte Carlo: the upper limit covers") {
  std::mt19937_64 random(13);
  constexpr int kRepeats = 2000, kBins = 200;
  // Above what noise alone exceeds in 5 %, 1.645 sqrt(200 / 9 * 1.5) = 9.5: below, that is the
  // limit, and it covers always.
  const double amplitude = 0.4, truth = kBins * amplitude * amplitude / 2.0;
  int covered = 0;
  for (int r = 0; r < kRepeats; ++r) {
    covered += drawn(kBins, amplitude, 1.0, random).upper_limit() >= truth;
  }
  // Normal approximation of a chi-square of 400 degrees of freedom: its skewness, sqrt(8 / 400),
  // moves the tail by about 0.14 (1.645^2 - 1) / 6 = 0.04 sigma, 0.4 % of coverage.
  CHECK(covered > kRepeats * 0.946 - 3.3 * std::sqrt(kRepeats * 0.95 * 0.05));
  CHECK(covered < kRepeats * 0.962 + 3.3 * std::sqrt(kRepeats * 0.95 * 0.05));
}

TEST_CASE("groups of unequal noise keep their own in the sum") {
  std::mt19937_64 random(14);
  constexpr int kRepeats = 2000;
  double squares = 0.0, stated = 0.0;
  const double truth = 0.5 * (50 * 4.0 + 50 * 0.0);
  for (int r = 0; r < kRepeats; ++r) {
    // All distortion stands where the noise is low.
    PeriodicPower p = drawn(50, 2.0, 0.1, random);
    p += drawn(50, 0.0, 1.0, random);
    squares += std::pow(p.periodic().value - truth, 2);
    stated += std::pow(p.periodic().u, 2);
  }
  CHECK(squares / stated == doctest::Approx(1.0).epsilon(0.12));
}
