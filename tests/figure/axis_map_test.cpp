// SPDX-License-Identifier: GPL-3.0-or-later
#include "figure/axis_map.h"

#include <cmath>

#include "doctest/doctest.h"

namespace kneeprint {
namespace {

Figure figure_of(std::vector<FigurePoint> points) {
  Figure f;
  f.series.push_back({"", SeriesStyle::line, 0, std::move(points), false});
  return f;
}

FigurePoint point(double x, double y) {
  FigurePoint p;
  p.x = x;
  p.y = y;
  return p;
}

TEST_CASE("linear and logarithmic axes place values in proportion") {
  AxisMap linear({-60.0, 0.0}, false);
  linear.place(100.0, 400.0);
  CHECK(linear.at(-60.0) == 100.0);
  CHECK(linear.at(-30.0) == 250.0);
  CHECK(linear.at_clamped(20.0) == 400.0);
  CHECK_FALSE(linear.covers(0.1));
  AxisMap log({0.01, 100.0}, true);
  log.place(0.0, 4.0);
  CHECK(log.at(1.0) == doctest::Approx(2.0));
  CHECK_FALSE(log.usable(0.0));
  CHECK_FALSE(log.usable(NAN));
}

TEST_CASE("the range comes from the points, not from what cannot be drawn") {
  auto f = figure_of({point(-30, -80), point(NAN, 5), point(10, -20), point(0, INFINITY)});
  f.series[0].points[0].low = -1000.0;
  const AxisMap y = y_axis_map(f, 6);
  CHECK(y.range().low == -100.0);
  CHECK(y.range().high == 0.0);
  const AxisMap x = x_axis_map(f, 6);
  CHECK(x.range().low == doctest::Approx(-31.0));  // 2.5 % of 40 either side
  CHECK(x.range().high == doctest::Approx(11.0));
}

TEST_CASE("stated ends are kept; an empty figure has an axis") {
  auto f = figure_of({point(0, 1), point(1, 2)});
  f.y.low = -3.0;
  f.y.high = 7.5;
  CHECK(y_axis_map(f, 6).range().low == -3.0);
  CHECK(y_axis_map(f, 6).range().high == 7.5);
  Figure none;
  none.y.logarithmic = true;
  CHECK(y_axis_map(none, 6).range().high > y_axis_map(none, 6).range().low);
  CHECK(x_axis_map(none, 6).ticks(6).size() > 2);
}

TEST_CASE("part of an open band is in sight") {
  auto f = figure_of({point(0, 0), point(1, -100)});
  FigurePoint top = point(0, 0);
  top.high = -100.0;
  f.bands.push_back({"rig floor", {top}});
  CHECK(y_axis_map(f, 6).range().low <= -106.0);
}

}  // namespace
}  // namespace kneeprint
