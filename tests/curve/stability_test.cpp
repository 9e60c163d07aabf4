// SPDX-License-Identifier: GPL-3.0-or-later
#include "curve/stability.h"

#include <doctest/doctest.h>

#include <boost/math/distributions/binomial.hpp>
#include <cmath>
#include <random>

using namespace kneeprint;

namespace {

constexpr double kNormal95 = 1.959963984540054;

ScalarPoint reading(double db, double standard_u, double hz = 997.0) {
  ScalarPoint p;
  p.method = "reference";
  p.frequency_hz = hz;
  p.figure = "reference-gain";
  p.value = db;
  p.value_unit = "dB";
  p.expanded_u = kNormal95 * standard_u;
  return p;
}

Curves with(const std::vector<double>& gains, double u, double hz = 997.0) {
  Curves c;
  for (const double g : gains) c.scalars.push_back(reading(g, u, hz));
  LevelPoint level;
  level.gain_u_db = 0.03;
  level.output_u_db = 0.04;
  c.levels.push_back(level);
  HarmonicPoint harmonic;
  harmonic.level_u_db = 0.05;
  harmonic.expanded_u_db = 0.06;
  c.harmonics.push_back(harmonic);
  ResponsePoint response;
  response.expanded_u_db = 0.07;
  c.responses.push_back(response);
  return c;
}

std::vector<ScalarPoint> drift_rows(const Curves& c) {
  std::vector<ScalarPoint> rows;
  for (const auto& p : c.scalars) {
    if (p.figure == "gain-drift") rows.push_back(p);
  }
  return rows;
}

}  // namespace

TEST_CASE("chi-square, range and the rectangular term in closed form") {
  // Mean 10.1; residuals -0.1, 0, 0.1 in units of u = 0.01: chi-square 200 with 2 degrees of
  // freedom, whose quantile at 0.1 % is -2 ln 0.001 = 13.8.
  const auto d = drift_of(with({10.0, 10.1, 10.2}, 0.01));
  REQUIRE(d);
  CHECK(d->readings == 3);
  CHECK(d->chi_square == doctest::Approx(200.0));
  CHECK(d->significant);
  CHECK(d->range_db == doctest::Approx(0.2));
  CHECK(d->u_db == doctest::Approx(0.1 / std::sqrt(3.0)));
  CHECK(d->range_u_db == doctest::Approx(kNormal95 * 0.01 * std::sqrt(2.0)));
  // Just under and just over the quantile: residuals -r, 0, r give 2 (r / u)^2.
  const double edge = 0.01 * std::sqrt(-std::log(0.001));
  CHECK(!drift_of(with({-0.999 * edge, 0.0, 0.999 * edge}, 0.01))->significant);
  CHECK(drift_of(with({-1.001 * edge, 0.0, 1.001 * edge}, 0.01))->significant);
}

TEST_CASE("a significant drift is added in quadrature, where it belongs") {
  Curves c = with({10.0, 10.1, 10.2}, 0.01);
  add_drift(c);
  const double term = kNormal95 * 0.1 / std::sqrt(3.0);
  CHECK(*c.levels[0].gain_u_db == doctest::Approx(std::hypot(0.03, term)));
  CHECK(*c.levels[0].output_u_db == doctest::Approx(std::hypot(0.04, term)));
  CHECK(*c.harmonics[0].level_u_db == doctest::Approx(std::hypot(0.05, term)));
  CHECK(*c.harmonics[0].expanded_u_db == 0.06);  // relative to the fundamental: it cancels
  CHECK(*c.responses[0].expanded_u_db == doctest::Approx(std::hypot(0.07, term)));
  const auto rows = drift_rows(c);
  REQUIRE(rows.size() == 1);
  CHECK(*rows[0].value == doctest::Approx(0.2));
  CHECK(*rows[0].expanded_u == doctest::Approx(kNormal95 * 0.01 * std::sqrt(2.0)));
  CHECK(rows[0].flag == Flag::none);
  CHECK(rows[0].value_unit == "dB");
}

TEST_CASE("without a drift beyond the statistics: an upper limit, nothing added") {
  Curves c = with({10.0, 10.01, 10.005}, 0.01);
  add_drift(c);
  CHECK(*c.levels[0].gain_u_db == 0.03);
  CHECK(*c.responses[0].expanded_u_db == 0.07);
  const auto rows = drift_rows(c);
  REQUIRE(rows.size() == 1);
  CHECK(rows[0].flag == Flag::noise);
  CHECK(*rows[0].value == doctest::Approx(0.01 + 1.6448536 * std::sqrt(2.0) * 0.01));
  CHECK(!rows[0].expanded_u);
}

TEST_CASE("nothing to judge: no rows; flagged readings do not count") {
  for (auto c : {with({}, 0.01), with({10.0}, 0.01)}) {
    CHECK(!drift_of(c));
    const auto rows = c.scalars.size();
    add_drift(c);
    CHECK(c.scalars.size() == rows);
  }
  Curves c = with({10.0, 10.0}, 0.01);
  c.scalars.push_back(reading(12.0, 0.01));
  c.scalars.back().flag = Flag::unsteady;
  CHECK(!drift_of(c)->significant);
}

TEST_CASE("frequencies are judged apart; the widest significant one is the term") {
  Curves c = with({10.0, 10.1, 10.2}, 0.01);
  for (const double g : {-3.0, -2.4}) c.scalars.push_back(reading(g, 1.0, 41.0));
  const auto all = drifts_of(c);
  REQUIRE(all.size() == 2);
  CHECK(all[0].frequency_hz == 41.0);
  CHECK(!all[0].significant);  // wider, but within its noise
  CHECK(drift_of(c)->frequency_hz == 997.0);
  add_drift(c);
  REQUIRE(drift_rows(c).size() == 2);
  CHECK(drift_rows(c)[0].flag == Flag::noise);
  CHECK(drift_rows(c)[1].flag == Flag::none);
}

TEST_CASE("noise alone is called a drift in 0.1 % of runs, and its limit holds in 95 %") {
  constexpr int kRuns = 20000, kReadings = 12;
  std::mt19937_64 random(8);
  std::normal_distribution<double> noise(0.0, 0.01);
  int drifts = 0, held = 0;
  for (int r = 0; r < kRuns; ++r) {
    std::vector<double> still, moving;
    for (int k = 0; k < kReadings; ++k) {
      still.push_back(noise(random));
      moving.push_back(noise(random) + 0.02 * k / (kReadings - 1));  // a true range of 0.02
    }
    drifts += drift_of(with(still, 0.01))->significant;
    held += drift_of(with(moving, 0.01))->limit_db >= 0.02;
  }
  const boost::math::binomial few(kRuns, 0.001);
  CHECK(drifts <= boost::math::quantile(boost::math::complement(few, 0.0003)));
  CHECK(drifts >= boost::math::quantile(few, 0.0003));
  CHECK(held >= boost::math::quantile(boost::math::binomial(kRuns, 0.95), 0.0003));
}
