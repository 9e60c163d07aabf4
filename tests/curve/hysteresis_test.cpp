// SPDX-License-Identifier: GPL-3.0-or-later
#include "curve/hysteresis.h"

#include <doctest/doctest.h>

#include <boost/math/distributions/binomial.hpp>
#include <boost/math/distributions/normal.hpp>
#include <cmath>
#include <random>

#include "curve/upright.h"

using namespace kneeprint;

namespace {

constexpr double kNormal95 = 1.959963984540054;

// A harmonic of `db` over the drive with a type A deviation of `u_db`.
HarmonicPoint point(const std::string& direction, double drive, int order, double db, double u_db) {
  HarmonicPoint p;
  p.frequency_hz = 997.0;
  p.drive = drive;
  p.order = order;
  p.direction = direction;
  p.level = drive + db;
  p.level_u_db = 1.0;  // calibration and floor: common to both ways
  p.noise_u_db = u_db;
  return p;
}

std::vector<ScalarPoint> loop_rows(Curves c) {
  c.scalars.clear();
  add_hysteresis(c);
  return c.scalars;
}

}  // namespace

TEST_CASE("the largest difference in its own uncertainties is reported") {
  Curves c;
  const double drives[] = {-40.0, -30.0, -20.0};
  const double up[] = {0.0, 0.0, -0.5}, down[] = {0.3, 0.05, -0.48};
  const double u[] = {0.2, 0.002, 0.01};
  for (int k = 0; k < 3; ++k) c.harmonics.push_back(point("up", drives[k], 1, up[k], u[k]));
  for (int k = 2; k >= 0; --k) c.harmonics.push_back(point("down", drives[k], 1, down[k], u[k]));
  const auto rows = loop_rows(c);
  REQUIRE(rows.size() == 1);
  CHECK(rows[0].figure == "ladder-loop-gain");
  CHECK(*rows[0].drive == -30.0);
  CHECK(*rows[0].frequency_hz == 997.0);
  CHECK(*rows[0].value == doctest::Approx(0.05));
  CHECK(*rows[0].expanded_u == doctest::Approx(kNormal95 * 0.002 * std::sqrt(2.0)));
  CHECK(rows[0].flag == Flag::none);
}

TEST_CASE("Bonferroni: the quantile at 5 % over all comparisons, just inside and just outside") {
  for (const double share : {0.999, 1.001}) {
    Curves c;
    const double u = 0.01;
    // Four comparisons: two drives, two orders.
    const double edge =
        u * std::sqrt(2.0) *
        boost::math::quantile(boost::math::complement(boost::math::normal(), 0.05 / 8.0));
    for (const double drive : {-40.0, -20.0}) {
      for (const int order : {1, 2}) {
        const double level = order == 1 ? 0.0 : -50.0;
        const bool moved = order == 2 && drive == -20.0;
        c.harmonics.push_back(point("up", drive, order, level, u));
        c.harmonics.push_back(point("down", drive, order, level - (moved ? share * edge : 0.0), u));
      }
    }
    const auto rows = loop_rows(c);
    REQUIRE(rows.size() == 2);
    CHECK(rows[0].flag == Flag::noise);
    CHECK(*rows[0].value == doctest::Approx(1.6448536 * u * std::sqrt(2.0)));
    CHECK(rows[1].figure == "ladder-loop-h2");
    if (share > 1.0) {
      CHECK(rows[1].flag == Flag::none);
      CHECK(*rows[1].value == doctest::Approx(-share * edge));
    } else {
      CHECK(rows[1].flag == Flag::noise);
      CHECK(*rows[1].value == doctest::Approx(share * edge + 1.6448536 * u * std::sqrt(2.0)));
      CHECK(!rows[1].expanded_u);
    }
  }
}

TEST_CASE("few degrees of freedom ask for more") {
  // 4 and 4: Welch-Satterthwaite gives 8; one comparison. Student's t at 8: 2.306 (97.5 %), 1.8595
  // (95 %).
  for (const double share : {0.999, 1.001}) {
    Curves c;
    const double u = 0.01, edge = 2.3060041 * u * std::sqrt(2.0);
    c.harmonics = {point("up", -20.0, 1, 0.0, u), point("down", -20.0, 1, share * edge, u)};
    for (auto& h : c.harmonics) h.noise_dof = 4.0;
    const auto rows = loop_rows(c);
    REQUIRE(rows.size() == 1);
    CHECK(rows[0].flag == (share > 1.0 ? Flag::none : Flag::noise));
    if (share > 1.0) {
      CHECK(*rows[0].expanded_u == doctest::Approx(edge));
    } else {
      CHECK(*rows[0].value == doctest::Approx(share * edge + 1.8595480 * u * std::sqrt(2.0)));
    }
  }
}

TEST_CASE("flagged points and points without a partner are not compared") {
  Curves c;
  c.harmonics = {point("up", -20.0, 1, 0.0, 0.01), point("down", -30.0, 1, 1.0, 0.01)};
  CHECK(loop_rows(c).empty());
  c.harmonics[1] = point("down", -20.0, 1, 1.0, 0.01);
  CHECK(loop_rows(c).size() == 1);
  c.harmonics[1].flag = Flag::unsteady;
  CHECK(loop_rows(c).empty());
  c.harmonics = {point("up", -20.0, 6, 0.0, 0.01), point("down", -20.0, 6, 1.0, 0.01)};
  CHECK(loop_rows(c).empty());  // H2 to H5
  c.harmonics = {point("up", -20.0, 1, 0.0, 0.0), point("down", -20.0, 1, 1.0, 0.0)};
  CHECK(loop_rows(c).empty());  // noise unknown
}

TEST_CASE("a drift of the gain is no loop") {
  Curves c;
  c.harmonics = {point("up", -20.0, 1, 0.0, 0.001), point("down", -20.0, 1, 0.07, 0.001)};
  CHECK(loop_rows(c)[0].flag == Flag::none);
  // A range of 0.1 dB: 0.0289 dB for each way, 0.041 dB for the difference.
  for (const double gain : {0.0, 0.1}) {
    ScalarPoint p;
    p.figure = "reference-gain";
    p.frequency_hz = 997.0;
    p.value = gain;
    p.expanded_u = 0.002;
    c.scalars.push_back(p);
  }
  add_hysteresis(c);
  CHECK(c.scalars.back().figure == "ladder-loop-gain");
  CHECK(c.scalars.back().flag == Flag::noise);
}

TEST_CASE("without a loop a measurement shows one in at most 5 % of runs") {
  constexpr int kRuns = 4000;
  std::mt19937_64 random(4);
  std::normal_distribution<double> noise(0.0, 0.01);
  int loops = 0;
  for (int r = 0; r < kRuns; ++r) {
    Curves c;
    for (int rung = 0; rung < 6; ++rung) {
      for (const std::string direction : {"up", "down"}) {
        for (int order = 1; order <= 5; ++order) {
          c.harmonics.push_back(point(direction, -60.0 + 6.0 * rung, order,
                                      -20.0 * (order - 1) + noise(random), 0.01));
        }
      }
    }
    bool any = false;
    for (const auto& row : loop_rows(c)) any |= row.flag == Flag::none;
    loops += any;
  }
  // 30 independent comparisons: 1 - (1 - 0.05 / 30)^30 = 4.88 %.
  const boost::math::binomial expected(kRuns, 1.0 - std::pow(1.0 - 0.05 / 30.0, 30));
  CHECK(loops >= boost::math::quantile(expected, 0.0005));
  CHECK(loops <= boost::math::quantile(boost::math::complement(expected, 0.0005)));
}

TEST_CASE("ascending keeps the way up, and everything else") {
  Curves c;
  c.harmonics = {point("up", -20.0, 1, 0.0, 0.01), point("down", -20.0, 1, 0.0, 0.01)};
  c.levels.resize(2);
  c.levels[1].direction = "down";
  c.scalars.resize(3);
  c.responses.resize(1);
  const Curves up = ascending(c);
  REQUIRE(up.harmonics.size() == 1);
  CHECK(up.harmonics[0].direction == "up");
  REQUIRE(up.levels.size() == 1);
  CHECK(up.levels[0].direction == "up");
  CHECK(up.scalars.size() == 3);
  CHECK(up.responses.size() == 1);
}

TEST_CASE("a reel's reference rung is one of the way up; its scalar levels follow it") {
  Curves c;
  c.levels.resize(2);
  for (std::size_t k = 0; k < 2; ++k) {
    c.levels[k].asked_hz = 997.0;
    c.levels[k].drive = k == 0 ? -60.0 : -60.001;  // as a reference return might read it
    c.levels[k].output = k == 0 ? -50.0 : -49.0;
  }
  c.levels[1].direction = "down";
  c.scalars.resize(2);
  c.scalars[0].value = -90.0;
  c.scalars[0].value_unit = "dBFS";
  c.scalars[1].value = 0.3;
  c.scalars[1].value_unit = "dB";
  make_relative(c, 997.0);
  CHECK(*c.levels[0].output == doctest::Approx(0.0));
  CHECK(*c.scalars[0].value == doctest::Approx(-40.0));
  CHECK(*c.scalars[1].value == 0.3);
}
