// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/coherent.h"

#include <doctest/doctest.h>

#include <array>
#include <cmath>
#include <numeric>
#include <utility>

using namespace kneeprint;

TEST_CASE(
    "whole cycles fill the block, the shift is under 0.1 %, harmonics keep clear of the mains") {
  for (const double rate : {44100.0, 48000.0, 88200.0, 96000.0, 176400.0, 192000.0}) {
    for (const double asked : {31.5, 41.0, 63.0, 100.0, 250.0, 997.0, 1000.0, 4990.0, 10000.0}) {
      CAPTURE(rate);
      CAPTURE(asked);
      const CoherentTone t = coherent_tone(Hertz(asked), Hertz(rate), Seconds(0.5), 10);
      const double cycles = t.frequency.value() * static_cast<double>(t.block) / rate;
      CHECK(std::abs(cycles - std::round(cycles)) < 1e-9);
      CHECK(std::abs(t.frequency.value() / asked - 1.0) <= 0.001 * (1.0 + 1e-9));
      CHECK(static_cast<double>(t.block) / rate >= 0.5);
      CHECK(t.block % static_cast<std::size_t>(rate / 10.0) == 0);
      for (int n = 1; n <= 10; ++n) {
        for (const double mains : {50.0, 60.0}) {
          // 100 Hz and 250 Hz stand on multiples themselves: 0.1 % of them is all the room there
          // is.
          const double least = asked == 100.0 ? 0.1 : asked == 250.0 ? 0.2 : 1.0;
          CHECK(std::abs(std::remainder(n * t.frequency.value(), mains)) >= least * (1.0 - 1e-6));
        }
      }
    }
  }
}

TEST_CASE("1 kHz is moved off the mains grid, 997 Hz stays where it is when the block allows") {
  CHECK(coherent_tone(Hertz(1000.0), Hertz(48000.0), Seconds(1.0), 10).frequency.value() != 1000.0);
  CHECK(coherent_tone(Hertz(997.0), Hertz(48000.0), Seconds(1.0), 10).frequency.value() == 997.0);
}

TEST_CASE("two-tone blocks hold whole cycles of both tones") {
  const std::array smpte{Hertz(60.0), Hertz(7000.0)};
  const std::array ccif{Hertz(19000.0), Hertz(20000.0)};
  CHECK(common_block(smpte, Hertz(48000.0), Seconds(0.5)) == 24000);
  CHECK(common_block(ccif, Hertz(44100.0), Seconds(0.25)) == 13230);
}

TEST_CASE("pairs: whole cycles of both, every second bin free, at most 0.1 % off") {
  for (const double rate : {44100.0, 48000.0, 96000.0}) {
    for (const auto& [a, b] : {std::pair(60.0, 7000.0),
                               {4130.0, 7013.0},
                               {41.3, 7013.7},
                               {33.333, 12345.678},
                               {8000.0, 11950.0},
                               {10000.25, 10080.5}}) {
      CAPTURE(rate);
      CAPTURE(a);
      const CoherentPair p = coherent_pair(Hertz(a), Hertz(b), Hertz(rate), Seconds(0.5));
      const double bin = rate / static_cast<double>(p.block);
      CHECK(p.f1.value() == doctest::Approx(static_cast<double>(p.cycles1) * bin).epsilon(1e-12));
      CHECK(p.f2.value() == doctest::Approx(static_cast<double>(p.cycles2) * bin).epsilon(1e-12));
      CHECK(std::gcd(p.cycles1, p.cycles2) >= 2);
      CHECK(static_cast<double>(p.block) >= 0.5 * rate);
      CHECK(std::abs(p.f1.value() / a - 1.0) <= 0.001);
      CHECK(std::abs(p.f2.value() / b - 1.0) <= 0.001);
      CHECK(std::abs((p.f2 - p.f1).value() / (b - a) - 1.0) <= 0.001);
      if (a == std::floor(a) && b == std::floor(b)) {
        CHECK(p.f1 == Hertz(a));
        CHECK(p.f2 == Hertz(b));
      }
    }
  }
}
