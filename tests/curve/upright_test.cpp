// SPDX-License-Identifier: GPL-3.0-or-later
#include "curve/upright.h"

#include <doctest/doctest.h>

#include <cmath>

using namespace kneeprint;

namespace {

LevelPoint level(double asked, double drive, double output, Cell polarity) {
  LevelPoint p;
  p.asked_hz = asked;
  p.drive = drive;
  p.output = output;
  p.polarity = polarity;
  return p;
}

HarmonicPoint harmonic(double f, double drive, int order, double relative_db) {
  HarmonicPoint p;
  p.frequency_hz = f;
  p.drive = drive;
  p.order = order;
  p.relative_db = relative_db;
  p.expanded_u_db = 0.01;
  p.phase_deg = 0.0;
  p.in_phase = 0.5;
  return p;
}

}  // namespace

TEST_CASE("polarity is stated when the levels of that frequency agree") {
  Curves c;
  c.levels = {level(997, -20, -20, -1.0), level(997, -10, -10, -1.0), level(41, -20, -20, {})};
  CHECK(stated_polarity(c, 997) == -1);
  CHECK(stated_polarity(c, 41) == 0);
  c.levels.push_back(level(997, 0, 0, 1.0));
  CHECK(stated_polarity(c, 997) == 0);
}

TEST_CASE("an inverting unit's curve is given upright: even orders turn, odd ones stay") {
  Curves c;
  c.harmonics = {harmonic(997, -20, 2, -40), harmonic(997, -20, 3, -60)};
  make_upright(c, -1);
  CHECK(std::abs(*c.harmonics[0].phase_deg) == doctest::Approx(180.0));
  CHECK(c.harmonics[0].in_phase == -0.5);
  CHECK(*c.harmonics[1].phase_deg == 0.0);
  CHECK(c.harmonics[1].in_phase == 0.5);
}

TEST_CASE(
    "products of an inverting unit: even orders turn, odd ones stay; levels become relative") {
  Curves c;
  c.levels = {level(997, -40, -50, -1.0)};
  for (const auto& [k1, k2] : {std::pair(1, 0), {-1, 1}, {2, -1}, {-2, 2}}) {
    ProductPoint p;
    p.k1 = k1;
    p.k2 = k2;
    p.order = std::abs(k1) + std::abs(k2);
    p.phase_deg = 0.0;
    p.level = -60.0;
    c.products.push_back(p);
  }
  make_upright(c, -1);
  CHECK(*c.products[0].phase_deg == 0.0);
  CHECK(std::abs(*c.products[1].phase_deg) == 180.0);
  CHECK(*c.products[2].phase_deg == 0.0);
  CHECK(std::abs(*c.products[3].phase_deg) == 180.0);
  make_relative(c, 997);
  CHECK(*c.products[0].level == doctest::Approx(-10.0));
}

TEST_CASE("an undeclared reel is read relative to its lowest usable rung") {
  Curves c;
  c.levels = {level(997, -40, -47.3, 1.0), level(997, -20, -28.3, 1.0)};
  c.harmonics = {harmonic(997, -40, 1, 0)};
  c.harmonics[0].level = -47.3;
  c.harmonics[0].in_phase = std::pow(10.0, -47.3 / 20.0);
  make_relative(c, 997);
  CHECK(*c.levels[0].output == doctest::Approx(0.0));
  CHECK(*c.levels[1].output == doctest::Approx(19.0));
  CHECK(c.harmonics[0].in_phase == doctest::Approx(0.01));  // -40 dBFS in, gain 1
}

TEST_CASE("frequencies agree, disagree, or cannot be compared") {
  Curves c;
  c.harmonics = {harmonic(997, -20, 2, -40.0)};
  CHECK_FALSE(depends_on_frequency(c).has_value());
  c.harmonics.push_back(harmonic(41, -20, 2, -40.3));
  CHECK(depends_on_frequency(c) == false);
  c.harmonics.push_back(harmonic(4987, -20, 2, -42.0));
  CHECK(depends_on_frequency(c) == true);
}
