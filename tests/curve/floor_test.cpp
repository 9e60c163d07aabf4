// SPDX-License-Identifier: GPL-3.0-or-later
#include "curve/floor.h"

#include <doctest/doctest.h>

#include <cmath>
#include <limits>
#include <vector>

using kneeprint::Decibels;
using kneeprint::FloorPoint;
using kneeprint::LevelDbfs;
using kneeprint::RigFloor;

namespace {

// A handful of roundings of numbers near 1e-6: 1e-12 of the value is a thousand times those.
constexpr double kRounding = 1e-12;

double db(double amplitude) { return 20.0 * std::log10(amplitude); }

FloorPoint point(double level, int order, double relative) {
  return {LevelDbfs(level), order, Decibels(relative)};
}

// Out of order on purpose.
RigFloor example() {
  return RigFloor({point(-10, 3, -110), point(-60, 2, -120), point(0, 2, -100), point(-20, 2, -130),
                   point(-40, 3, -130)});
}

}  // namespace

TEST_CASE("an unknown floor answers nothing") {
  const RigFloor floor;
  CHECK_FALSE(floor.known());
  CHECK(floor.points().empty());
  CHECK_FALSE(floor.at(LevelDbfs(-20), LevelDbfs(-20), 2).has_value());
}

TEST_CASE("at a measured level both loop figures are added in magnitude") {
  const RigFloor floor = example();
  CHECK(floor.known());
  // Equal levels: twice the amplitude, 20 log10 2 dB more.
  const auto twice = floor.at(LevelDbfs(-20), LevelDbfs(-20), 2);
  REQUIRE(twice.has_value());
  CHECK(db(*twice) == doctest::Approx(-130.0 + 20.0 * std::log10(2.0)).epsilon(kRounding));
  // -130 dB and -100 dB: 10^-6.5 + 10^-5.
  const auto mixed = floor.at(LevelDbfs(-20), LevelDbfs(0), 2);
  REQUIRE(mixed.has_value());
  CHECK(*mixed == doctest::Approx(std::pow(10.0, -6.5) + 1e-5).epsilon(kRounding));
  // Which of the two is the send does not matter for a bound.
  CHECK(*mixed == *floor.at(LevelDbfs(0), LevelDbfs(-20), 2));
}

TEST_CASE("between levels the floor is a straight line in dB") {
  const RigFloor floor = example();
  for (const double share : {0.1, 0.25, 0.5, 0.9}) {
    const LevelDbfs rising(-20.0 + 20.0 * share), falling(-60.0 + 40.0 * share);
    CAPTURE(share);
    CHECK(*floor.at(rising, rising, 2) / 2.0 ==
          doctest::Approx(std::pow(10.0, (-130.0 + 30.0 * share) / 20.0)).epsilon(kRounding));
    CHECK(*floor.at(falling, falling, 2) / 2.0 ==
          doctest::Approx(std::pow(10.0, (-120.0 - 10.0 * share) / 20.0)).epsilon(kRounding));
  }
}

TEST_CASE("below the lowest level its value stands, above the highest nothing") {
  const RigFloor floor = example();
  constexpr double kSilence = -std::numeric_limits<double>::infinity();
  for (const double level : {-60.0, -75.0, -1000.0, kSilence}) {
    CAPTURE(level);
    CHECK(*floor.at(LevelDbfs(level), LevelDbfs(level), 2) ==
          doctest::Approx(2e-6).epsilon(kRounding));
  }
  CHECK_FALSE(floor.at(LevelDbfs(0.01), LevelDbfs(-20), 2).has_value());
  CHECK_FALSE(floor.at(LevelDbfs(-20), LevelDbfs(0.01), 2).has_value());
  // Order 3 was measured up to -10 dBFS only.
  CHECK(floor.at(LevelDbfs(-10), LevelDbfs(-10), 3).has_value());
  CHECK_FALSE(floor.at(LevelDbfs(-5), LevelDbfs(-10), 3).has_value());
}

TEST_CASE("a level read back from a take, off by rounding, counts as the measured one") {
  const RigFloor floor = example();
  for (const double level : {-60.0, -20.0, 0.0}) {
    const double exact = *floor.at(LevelDbfs(level), LevelDbfs(level), 2);
    // Every double on the way from 1e-6 dB under to 1e-6 dB over would be too many: both sides of
    // the edge, and 1e-9 beside it.
    for (const double off : {-1e-6, -1e-9, 1e-9, 0.999e-6}) {
      CAPTURE(level);
      CAPTURE(off);
      const auto near = floor.at(LevelDbfs(level + off), LevelDbfs(level + off), 2);
      REQUIRE(near.has_value());
      // The steepest line is 1.5 dB for 1 dB: 1.5e-6 dB, 2e-7 of the amplitude.
      CHECK(*near == doctest::Approx(exact).epsilon(2e-7));
    }
  }
  double level = -60.0 + 1e-6;  // just where "the lowest" ends: no point stands below it
  for (int i = 0; i < 8; ++i) {
    CHECK(*floor.at(LevelDbfs(level), LevelDbfs(level), 2) == doctest::Approx(2e-6).epsilon(2e-7));
    level = std::nextafter(level, 0.0);
  }
}

TEST_CASE("orders never measured, and levels that are no number, answer nothing") {
  const RigFloor floor = example();
  for (const int order : {-1, 0, 1, 4, 10}) {
    CAPTURE(order);
    CHECK_FALSE(floor.at(LevelDbfs(-20), LevelDbfs(-20), order).has_value());
  }
  const double nan = std::numeric_limits<double>::quiet_NaN();
  CHECK_FALSE(floor.at(LevelDbfs(nan), LevelDbfs(-20), 2).has_value());
}

TEST_CASE("one level alone serves everything up to it") {
  const RigFloor floor({point(-12, 2, -115)});
  CHECK(db(*floor.at(LevelDbfs(-30), LevelDbfs(-12), 2) / 2.0) ==
        doctest::Approx(-115.0).epsilon(kRounding));
  CHECK_FALSE(floor.at(LevelDbfs(-11), LevelDbfs(-12), 2).has_value());
}

TEST_CASE("points are kept by order, then level") {
  const RigFloor floor = example();
  REQUIRE(floor.points().size() == 5);
  const std::vector<std::pair<int, double>> expected{
      {2, -60.0}, {2, -20.0}, {2, 0.0}, {3, -40.0}, {3, -10.0}};
  for (std::size_t i = 0; i < expected.size(); ++i) {
    CHECK(floor.points()[i].order == expected[i].first);
    CHECK(floor.points()[i].level.value() == expected[i].second);
  }
}

TEST_CASE("a pad in the loop tells the send's share from the return's") {
  // Send share 1e-6 at -10 dBFS, return share 4e-6 at -10 dBFS; with the pad the return rests at
  // -30 dBFS and shows nothing.
  std::vector<FloorPoint> points{point(-30, 2, db(1e-7)), point(-10, 2, db(5e-6))};
  FloorPoint padded = point(-10, 2, db(1e-6));
  padded.ret = LevelDbfs(-30.2);
  points.push_back(padded);
  const RigFloor floor(points);
  // At the pair of the pad: the send's own, and what the loop shows with both at the low level.
  CHECK(*floor.at(LevelDbfs(-10), LevelDbfs(-30.2), 2) ==
        doctest::Approx(1e-6 + 1e-7).epsilon(kRounding));
  // At equal levels the loop's figure still bounds the return's share.
  CHECK(*floor.at(LevelDbfs(-10), LevelDbfs(-10), 2) ==
        doctest::Approx(1e-6 + 5e-6).epsilon(kRounding));
}

TEST_CASE("between measured frequencies the larger neighbour counts") {
  std::vector<FloorPoint> points;
  for (const auto& [hz, relative] : {std::pair{41.0, -100.0}, {997.0, -120.0}, {4990.0, -110.0}}) {
    FloorPoint p = point(-10, 2, relative);
    p.frequency = kneeprint::Hertz(hz);
    points.push_back(p);
  }
  const RigFloor floor(points);
  const auto at = [&](double hz) {
    return db(*floor.at(LevelDbfs(-20), LevelDbfs(-20), 2, kneeprint::Hertz(hz)) / 2.0);
  };
  CHECK(at(20.0) == doctest::Approx(-100.0));
  CHECK(at(100.0) == doctest::Approx(-100.0));
  CHECK(at(996.667) == doctest::Approx(-120.0));  // as played, after the shift to whole cycles
  CHECK(at(900.0) == doctest::Approx(-100.0));
  CHECK(at(2000.0) == doctest::Approx(-110.0));
  CHECK(at(9000.0) == doctest::Approx(-110.0));
  CHECK(at(0.0) == doctest::Approx(-100.0));
}

TEST_CASE("products have a floor of their own") {
  FloorPoint p = point(-10, 0, -115);
  p.product = "smpte m2";
  const RigFloor floor({p, point(-10, 2, -130)});
  CHECK(db(*floor.at_product(LevelDbfs(-20), LevelDbfs(-20), "smpte", "m2") / 2.0) ==
        doctest::Approx(-115.0));
  CHECK_FALSE(floor.at_product(LevelDbfs(-20), LevelDbfs(-20), "smpte", "m3").has_value());
  CHECK(db(*floor.at(LevelDbfs(-20), LevelDbfs(-20), 2) / 2.0) == doctest::Approx(-130.0));
}
