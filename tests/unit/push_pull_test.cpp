// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/push_pull.h"

#include <doctest/doctest.h>

#include <cmath>

#include "unit/fet_law.h"
#include "unit/harmonics.h"

using kneeprint::ekv_drain_current;
using kneeprint::push_pull_output;
using kneeprint::PushPullUnit;

namespace {

double through(PushPullUnit& unit, double volts) {
  unit.process({&volts, 1});
  return volts;
}

// sqrt(H3^2 + H5^2 + H7^2 + H9^2) / H1
double distortion(PushPullUnit& unit, double peak) {
  const auto h = [&](std::size_t n) {
    return harmonic([&](double v) { return through(unit, v); }, 0.0, peak, n);
  };
  return std::sqrt(h(3) * h(3) + h(5) * h(5) + h(7) * h(7) + h(9) * h(9)) / h(1);
}

}  // namespace

TEST_CASE("the currents at the output node add up to nothing") {
  for (double u = -4.0; u <= 4.0; u += 0.0917) {
    const double vo = push_pull_output(u).value;
    const double up = ekv_drain_current(u + PushPullUnit::kBias - vo, PushPullUnit::kRail - vo,
                                        PushPullUnit::kBeta)
                          .current;
    const double down = ekv_drain_current(vo - u + PushPullUnit::kBias, PushPullUnit::kRail + vo,
                                          PushPullUnit::kBeta)
                            .current;
    CHECK(std::fabs(up - down - vo / PushPullUnit::kLoadOhms) < 1e-12);
    const double h = 1e-6;
    CHECK(push_pull_output(u).slope ==
          doctest::Approx((push_pull_output(u + h).value - push_pull_output(u - h).value) / (2 * h))
              .epsilon(1e-5));
    CHECK(std::fabs(push_pull_output(-u).value + vo) < 1e-12);
  }
}

TEST_CASE("the unit reads the pair's curve") {
  PushPullUnit unit;
  for (double v = -20.0; v <= 20.0; v += 0.0333) {
    const double exact = PushPullUnit::kStepUp * push_pull_output(PushPullUnit::kPad * v).value;
    CHECK(std::fabs(through(unit, v) - exact) < 1e-9);
  }
}

TEST_CASE("distortion falls between crossover and the rails") {
  PushPullUnit unit;
  const double low = distortion(unit, 1.5);    // +3 dBu
  const double mid = distortion(unit, 9.0);    // +18 dBu
  const double high = distortion(unit, 17.0);  // +24 dBu
  CHECK(low > 0.05);
  CHECK(mid < 0.05);
  CHECK(high > 0.1);
  CHECK(through(unit, 20.0) < PushPullUnit::kStepUp * PushPullUnit::kRail);
}
