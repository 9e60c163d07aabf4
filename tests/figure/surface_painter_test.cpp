// SPDX-License-Identifier: GPL-3.0-or-later
#include "figure/surface_painter.h"

#include <doctest/doctest.h>

#include <cmath>
#include <limits>

#include "figure/cairo_painter.h"
#include "figure/palette.h"

using namespace kneeprint;

namespace {

Figure map_of(std::vector<SurfaceCell> cells, bool logarithmic) {
  Figure f;
  f.id = "map";
  f.title = "A map";
  f.x = {"frequency, Hz", 20.0, 2000.0, true};
  f.y = {"drive, dBu", -10.0, 10.0, false};
  f.surface = Surface{logarithmic, std::move(cells)};
  return f;
}

SurfaceCell cell(double x, double y, double value) { return {x, y, value, "7", false, false}; }

std::size_t count(const std::string& text, const std::string& wanted) {
  std::size_t n = 0;
  for (auto at = text.find(wanted); at != text.npos; at = text.find(wanted, at + 1)) ++n;
  return n;
}

}  // namespace

TEST_CASE("steps of the colour scale are round, even, and hold every value") {
  for (const auto& [low, high] : {std::pair{-97.3, -12.1}, {0.0, 1e-4}, {3.0, 3.0}, {-2.4, 5e3}}) {
    const auto steps = surface_steps(Surface{false, {cell(1, 1, low), cell(2, 1, high)}});
    REQUIRE(steps.size() == kRamp.size() + 1);
    CHECK(steps.front() <= low);
    CHECK(steps.back() > high);
    const double step = steps[1] - steps[0];
    const double mantissa = step / std::pow(10.0, std::floor(std::log10(step) + 1e-9));
    CHECK((std::abs(mantissa - 1.0) < 1e-6 || std::abs(mantissa - 2.0) < 1e-6 ||
           std::abs(mantissa - 2.5) < 1e-6 || std::abs(mantissa - 5.0) < 1e-6));
  }
  const auto steps = surface_steps(Surface{true, {cell(1, 1, 0.013), cell(2, 1, 25.0)}});
  CHECK(steps.front() <= 0.013);
  CHECK(steps.back() > 25.0);
  CHECK(steps[1] / steps[0] == doctest::Approx(steps[7] / steps[6]));
  CHECK(surface_steps({}).empty());
  CHECK(surface_steps(Surface{true, {cell(1, 1, -3.0)}}).empty());
}

TEST_CASE("cells reach half way to their neighbours, and as far outside") {
  const auto linear = surface_range({0.0, 10.0, 30.0}, false);
  CHECK(linear.first == -5.0);
  CHECK(linear.second == 40.0);
  const auto log = surface_range({10.0, 1000.0, 100.0}, true);
  CHECK(log.first == doctest::Approx(10.0 / std::sqrt(10.0)));
  CHECK(log.second == doctest::Approx(1000.0 * std::sqrt(10.0)));
  const auto one = surface_range({100.0}, true);
  CHECK(one.first < 100.0);
  CHECK(one.second > 100.0);
}

TEST_CASE("a cell without a number is left out; the same map gives the same bytes") {
  const double nan = std::numeric_limits<double>::quiet_NaN();
  const Figure whole =
      map_of({cell(50, -5, 1), cell(50, 5, 2), cell(500, -5, 3), cell(500, 5, 4)}, false);
  const Figure holed =
      map_of({cell(50, -5, 1), cell(50, 5, nan), cell(500, -5, 3), cell(500, 5, 4)}, false);
  const std::string a = svg(whole), b = svg(holed);
  CHECK(a == svg(whole));
  CHECK(b.find("nan") == b.npos);
  CHECK(count(a, "fill-rule") > count(b, "fill-rule"));
  CHECK(svg(map_of({}, true)).find("nan") == std::string::npos);
}
