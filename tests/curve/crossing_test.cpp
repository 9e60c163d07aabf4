// SPDX-License-Identifier: GPL-3.0-or-later
#include "curve/crossing.h"

#include <cmath>

#include "doctest/doctest.h"

namespace kneeprint {
namespace {

LevelPoint rung(double drive, double thd_percent, double u_percent = 0.0, double hz = 997.0) {
  LevelPoint p;
  p.frequency_hz = hz;
  p.drive = drive;
  p.thd_f_percent = thd_percent;
  p.thd_f_u_percent = u_percent;
  return p;
}

LevelPoint gain_rung(double drive, double gain) {
  LevelPoint p;
  p.frequency_hz = 997.0;
  p.drive = drive;
  p.output = drive + gain;
  p.gain_db = gain;
  return p;
}

// Tolerance of the closed forms below: rounding of a handful of double operations on values
// near 10.
constexpr double kRounding = 1e-12;

TEST_CASE("a power law in drive is crossed exactly where its closed form says") {
  // THD = c A^2 with A = 10^(drive/20): THD = 1 % where drive = -20 log10(c) / 2, for any rung
  // grid.
  const double c = 3.7;
  std::vector<LevelPoint> levels;
  for (double d = -40.0; d <= 10.0; d += 3.0) {
    const double thd = c * std::pow(10.0, 2.0 * d / 20.0);
    levels.push_back(rung(d, thd, 0.01 * thd));
  }
  const auto found = thd_crossings(levels, 997.0, 1.0);
  REQUIRE(found.size() == 1);
  CHECK(found[0].drive == doctest::Approx(-10.0 * std::log10(c)).epsilon(kRounding));
  CHECK(found[0].direction == Direction::up);
  // 1 % of THD is 0.01 * 20 / ln 10 dB; the slope is 2 dB per dB of drive.
  REQUIRE(found[0].expanded_u_db);
  CHECK(*found[0].expanded_u_db == doctest::Approx(0.1 / std::log(10.0)).epsilon(kRounding));
}

TEST_CASE("crossover gives several crossings, each with its direction") {
  const std::vector<LevelPoint> levels = {rung(0, 10.0), rung(10, 0.1), rung(20, 10.0)};
  const auto found = thd_crossings(levels, 997.0, 1.0);
  REQUIRE(found.size() == 2);
  CHECK(found[0].drive == doctest::Approx(5.0).epsilon(kRounding));
  CHECK(found[0].direction == Direction::down);
  CHECK(found[1].drive == doctest::Approx(15.0).epsilon(kRounding));
  CHECK(found[1].direction == Direction::up);
}

TEST_CASE("order of rows and other frequencies do not matter") {
  const std::vector<LevelPoint> levels = {rung(10, 10.0), rung(5, 50.0, 0, 41.0), rung(0, 0.1)};
  const auto found = thd_crossings(levels, 997.0, 1.0);
  REQUIRE(found.size() == 1);
  CHECK(found[0].drive == doctest::Approx(5.0).epsilon(kRounding));
  CHECK(frequencies_of(levels) == std::vector<double>{41.0, 997.0});
  CHECK(thd_crossings(levels, 41.0, 1.0).empty());
}

TEST_CASE("a rung on the threshold counts once") {
  const std::vector<LevelPoint> levels = {rung(0, 0.1), rung(10, 1.0), rung(20, 10.0)};
  const auto found = thd_crossings(levels, 997.0, 1.0);
  REQUIRE(found.size() == 1);
  CHECK(found[0].drive == 10.0);
}

TEST_CASE("no line is drawn across a flagged rung, and no uncertainty is made up") {
  auto levels = std::vector<LevelPoint>{rung(0, 0.1), rung(10, 1.5), rung(20, 10.0)};
  levels[1].flag = Flag::clipped;
  CHECK(thd_crossings(levels, 997.0, 1.0).empty());
  levels[1].flag = Flag::none;
  levels[1].thd_f_u_percent.reset();
  const auto found = thd_crossings(levels, 997.0, 1.0);
  REQUIRE(found.size() == 1);
  CHECK_FALSE(found[0].expanded_u_db.has_value());
  levels[1].thd_f_percent.reset();
  CHECK(thd_crossings(levels, 997.0, 1.0).empty());
  CHECK(thd_crossings({}, 997.0, 1.0).empty());
}

TEST_CASE("what a straight line misses of a bent curve is in the uncertainty") {
  // log-log parabola: 20 log10(THD) = 0.05 d^2, rungs at 12, 17, 22, 27; THD = 20 dB (10 %) where d
  // = 20. A parabola departs from its chord by exactly the remainder term, so the crossing lies off
  // by it over the slope (to first order), and the term is the whole uncertainty of noiseless
  // rungs.
  std::vector<LevelPoint> levels;
  for (double d = 12.0; d <= 28.0; d += 5.0)
    levels.push_back(rung(d, std::pow(10.0, 0.05 * d * d / 20.0)));
  const auto found = thd_crossings(levels, 997.0, 10.0);
  REQUIRE(found.size() == 1);
  REQUIRE(found[0].expanded_u_db);
  const double off = std::abs(found[0].drive - 20.0);
  CHECK(off > 0.05);
  CHECK(*found[0].expanded_u_db >= off);
  // Chord from 17 to 22: slope 0.05 * 39, crossed at share (20 - 14.45) / 9.75; y'' = 0.1.
  const double share = (20.0 - 14.45) / 9.75;
  CHECK(*found[0].expanded_u_db ==
        doctest::Approx(0.05 * share * (1.0 - share) * 25.0 / 1.95).epsilon(1e-9));
}

TEST_CASE("compression points of a gain that falls linearly in dB") {
  // gain = 20 - 0.2 (drive + 30): 1 dB down at -25, 3 dB down at -15.
  Curves curves;
  for (double d = -30.0; d <= -10.0; d += 4.0) {
    curves.levels.push_back(gain_rung(d, 20.0 - 0.2 * (d + 30)));
    HarmonicPoint h;
    h.frequency_hz = 997.0;
    h.drive = d;
    h.in_phase = 3.0;
    h.quadrature = 4.0;
    h.component_u = 0.005;  // a thousandth of the fundamental
    curves.harmonics.push_back(h);
  }
  const auto gain = relative_gain(curves, 997.0);
  REQUIRE(gain.size() == curves.levels.size());
  CHECK(gain[0].db == 0.0);
  const auto one = compression_point(gain, Decibels(1.0));
  const auto three = compression_point(gain, Decibels(3.0));
  REQUIRE(one);
  REQUIRE(three);
  CHECK(one->drive == doctest::Approx(-25.0).epsilon(kRounding));
  CHECK(three->drive == doctest::Approx(-15.0).epsilon(kRounding));
  REQUIRE(three->expanded_u_db);
  // 0.001 * 20 / ln 10 dB of each, 1.959964 at infinite degrees of freedom, over the slope; the six
  // digits of that quantile limit the agreement.
  const double expected = 0.001 * 20.0 / std::log(10.0) * 1.959964 * std::sqrt(2.0) / 0.2;
  CHECK(*three->expanded_u_db == doctest::Approx(expected).epsilon(1e-6));
  CHECK_FALSE(compression_point(gain, Decibels(30.0)).has_value());
}

TEST_CASE("the reference is the lowest usable rung, and a reel's empty gain does not matter") {
  Curves curves;
  curves.levels = {gain_rung(-30, 50), gain_rung(-20, 0), gain_rung(-10, -2)};
  curves.levels[0].flag = Flag::unsteady;
  for (auto& p : curves.levels) p.gain_db.reset();
  const auto gain = relative_gain(curves, 997.0);
  REQUIRE(gain.size() == 2);
  CHECK(gain[0].drive == -20.0);
  CHECK(gain[1].db == doctest::Approx(-2.0).epsilon(kRounding));
  CHECK_FALSE(gain[1].expanded_u_db.has_value());
  CHECK(relative_gain({}, 997.0).empty());

  curves.levels[1].flag = Flag::noise;  // the fundamental itself: no THD could be stated
  CHECK(relative_gain(curves, 997.0).size() == 1);
  curves.levels[1].thd_f_percent = 1e-4;  // harmonics alone: the gain stands
  CHECK(relative_gain(curves, 997.0).size() == 2);
}

}  // namespace
}  // namespace kneeprint
