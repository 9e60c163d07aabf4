// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/fill.h"

#include <doctest/doctest.h>

#include <array>
#include <boost/math/distributions/binomial.hpp>
#include <cmath>
#include <random>
#include <vector>

#include "method/periodic_power.h"

using namespace kneeprint;

TEST_CASE("clear cases count whole and are certain") {
  std::vector<BandAudibility> bands(40, {1.0, 0.1, 0.01, 0.0, Flag::none});
  for (int i = 0; i < 10; ++i) bands[static_cast<std::size_t>(i)].distortion = 3.0;
  const FillReading f = fill_of(bands);
  CHECK(f.percent == doctest::Approx(25.0));
  CHECK(*f.expanded_u == doctest::Approx(0.0));
  CHECK(f.flag == Flag::none);
}

TEST_CASE("bands at the threshold count half, and may all count or none") {
  // Four at the threshold: 0 .. 4 with binomial probabilities 1, 4, 6, 4, 1 of 16; 2.5 and 97.5 %
  // lie in the ends.
  std::vector<BandAudibility> bands(8, {1.0, 0.1, 0.01, 0.0, Flag::none});
  for (int i = 0; i < 4; ++i) bands[static_cast<std::size_t>(i)] = {1.0, 1.0, 0.3, 0.0, Flag::none};
  const FillReading f = fill_of(bands);
  CHECK(f.percent == doctest::Approx(25.0));
  CHECK(*f.expanded_u == doctest::Approx(25.0));
}

TEST_CASE("what was not seen never counts, but may hide") {
  const BandAudibility seen{1.0, 2.0, 0.0, 0.0, Flag::none};
  const BandAudibility hidden{1.0, 5.0, 3.0, 8.0, Flag::noise};
  const BandAudibility silent{1.0, 0.0, 0.1, 0.2, Flag::noise};
  const BandAudibility rig{1.0, 0.5, 0.1, 2.0, Flag::floor};
  FillReading f = fill_of(std::array{seen, hidden, silent, silent});
  CHECK(f.percent == doctest::Approx(25.0));
  CHECK(*f.expanded_u == doctest::Approx(25.0));
  CHECK(f.flag == Flag::none);
  f = fill_of(std::array{hidden, hidden, silent, silent});
  CHECK(f.percent == doctest::Approx(50.0));
  CHECK_FALSE(f.expanded_u);
  CHECK(f.flag == Flag::noise);
  f = fill_of(std::array{hidden, rig, silent, silent});
  CHECK(f.percent == doctest::Approx(50.0));
  CHECK(f.flag == Flag::floor);
  f = fill_of(std::array{silent, silent});
  CHECK(f.percent == 0.0);
  CHECK(f.flag == Flag::none);
}

TEST_CASE("Monte Carlo: fill is unbiased and its interval covers, noise and truth drawn anew") {
  std::mt19937_64 random(21);
  std::normal_distribution<double> noise(0.0, 1.0);
  std::uniform_real_distribution<double> decibels(-4.0, 4.0);
  constexpr int kRepeats = 400, kBands = 40, kBins = 60, kBlocks = 3;
  constexpr double kThreshold = 60.0;  // a noise of 20 in the mean, so u(D) is some 10 % there
  int covered = 0;
  double bias = 0.0, scatter = 0.0;
  for (int r = 0; r < kRepeats; ++r) {
    std::vector<BandAudibility> bands;
    double above = 0.0;
    for (int b = 0; b < kBands; ++b) {
      const double truth = kThreshold * std::pow(10.0, decibels(random) / 10.0);
      above += truth > kThreshold;
      PeriodicPower power;
      for (int k = 0; k < kBins; ++k) {
        std::array<std::complex<double>, kBlocks> bin;
        for (auto& z : bin) {
          const double re = std::sqrt(2.0 * truth / kBins) + noise(random);
          z = {re, noise(random)};
        }
        power.add(bin);
      }
      power.close_group();
      const Uncertain p = power.periodic();
      bands.push_back({kThreshold, p.value, p.u, power.upper_limit(),
                       power.seen(0.05 / kBands) ? Flag::none : Flag::noise});
    }
    const FillReading f = fill_of(bands);
    const double error = f.percent - 100.0 * above / kBands;
    covered += std::abs(error) <= *f.expanded_u;
    bias += error;
    scatter += error * error;
  }
  // Two-sided 0.1 % for a chance of 95 %; counts are whole numbers, so that the interval covers
  // rather more than that.
  const boost::math::binomial b(kRepeats, 0.95);
  MESSAGE("covered ", covered, " of ", kRepeats, ", mean error ", bias / kRepeats, " %, rms ",
          std::sqrt(scatter / kRepeats), " %");
  CHECK(covered >= boost::math::quantile(b, 0.001));
  // The threshold lies in the middle of what was drawn; a second-order bias of the probability (u
  // grows with D) is a fraction of a band.
  CHECK(std::abs(bias / kRepeats) < 1.0);
}
