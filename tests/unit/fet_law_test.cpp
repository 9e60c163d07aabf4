// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/fet_law.h"

#include <doctest/doctest.h>

#include <cmath>
#include <initializer_list>

#include "unit/diode_law.h"

using kneeprint::ekv_drain_current;

TEST_CASE("the EKV law tends to its published limits") {
  constexpr double n = 1.5, beta = 0.02;
  constexpr double vt = kneeprint::kThermalVolts;
  // Strong inversion, saturated: beta V^2 / (2 n); ln^2(1 + e^z) = z^2 within e^-z z: 1e-6 at 1.5
  // V.
  CHECK(ekv_drain_current(1.5, 3.0, beta).current ==
        doctest::Approx(beta * 1.5 * 1.5 / (2 * n)).epsilon(1e-6));
  // Strong inversion, small Vds: beta (V Vds - n Vds^2/2).
  CHECK(ekv_drain_current(1.5, 0.1, beta).current ==
        doctest::Approx(beta * (1.5 * 0.1 - n * 0.005)).epsilon(1e-6));
  // Weak inversion: 2 n beta Vt^2 exp(V/(n Vt)) within its own e^z: 3e-5 at -0.4 V.
  CHECK(ekv_drain_current(-0.4, 1.0, beta).current ==
        doctest::Approx(2 * n * beta * vt * vt * std::exp(-0.4 / (n * vt))).epsilon(1e-4));
  CHECK(ekv_drain_current(1.0, 0.0, beta).current == 0.0);
}

TEST_CASE("EKV derivatives agree with differences") {
  constexpr double h = 1e-6;
  for (const double gate : {-0.3, 0.0, 0.1, 0.8}) {
    for (const double drain : {0.05, 0.5, 2.0}) {
      const auto at = ekv_drain_current(gate, drain, 1.0);
      CHECK(at.by_gate == doctest::Approx((ekv_drain_current(gate + h, drain, 1.0).current -
                                           ekv_drain_current(gate - h, drain, 1.0).current) /
                                          (2 * h))
                              .epsilon(1e-6));
      CHECK(std::fabs(at.by_drain - (ekv_drain_current(gate, drain + h, 1.0).current -
                                     ekv_drain_current(gate, drain - h, 1.0).current) /
                                        (2 * h)) < 1e-8);
    }
  }
}
