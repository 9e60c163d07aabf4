// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/describe.h"

#include <doctest/doctest.h>

#include <cmath>

using namespace kneeprint;

namespace {

HarmonicPoint point(int order, double in_phase, double quadrature, double u,
                    Flag flag = Flag::none) {
  HarmonicPoint p;
  p.frequency_hz = 998.0;
  p.drive = -20.0;
  p.order = order;
  p.level = -20.0;
  p.in_phase = in_phase;
  p.quadrature = quadrature;
  p.component_u = u;
  p.flag = flag;
  return p;
}

Plan plan() {
  Plan p;
  p.steps = {{"steady", {Hertz(998.0)}}};
  return p;
}

}  // namespace

TEST_CASE("signs only within 20 degrees of the axis, in-phase parts near the noise") {
  Curves c;
  c.harmonics = {
      point(1, 0.1, 0.0, 1e-6),
      point(2, -0.01, 0.001, 1e-6),              // 6 degrees off the negative axis
      point(3, 0.001, 0.001, 1e-6),              // 45 degrees: magnitude only
      point(4, -2e-6, 3e-6, 1e-6, Flag::noise),  // under the noise: its unbiased part
      point(5, 0.01, 0.0, 1e-6, Flag::clipped),
      point(6, 0.01, 0.0, 1e-6, Flag::unsteady),
      point(7, 0.01, 0.0, 1e-6, Flag::alias),
  };
  c.harmonics.push_back(point(2, 0.5, 0.0, 1e-6));
  c.harmonics.back().frequency_hz = 41.0;  // not the fit's frequency
  const auto data = fit_data(c, plan(), {});
  REQUIRE(data.size() == 4);
  CHECK(data[0].input_peak == doctest::Approx(0.1));
  CHECK(data[1].has_sign);
  CHECK(data[1].value == doctest::Approx(-std::hypot(0.01, 0.001)));
  CHECK_FALSE(data[2].has_sign);
  CHECK(data[2].value == doctest::Approx(std::hypot(0.001, 0.001)));
  CHECK(data[3].has_sign);
  CHECK(data[3].value == -2e-6);
}
