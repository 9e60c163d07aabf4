// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/rig_curvature.h"

#include <doctest/doctest.h>

using namespace kneeprint;

TEST_CASE("a pure sine shows the residual itself, and three times the third on the fundamental") {
  const std::vector<std::complex<double>> sine{0.0, 1.0, 0.0, 0.0, 0.0};
  const auto f = curvature_floor(sine, 1e-6, 3e-7);
  CHECK(f[0] == doctest::Approx(1e-6));  // a2 / 2
  CHECK(f[1] == doctest::Approx(9e-7));  // 3/4 a3
  CHECK(f[2] == doctest::Approx(1e-6));
  CHECK(f[3] == doctest::Approx(3e-7));
  CHECK(f[4] < 1e-20);
}

TEST_CASE("harmonics of the response mix with the rig's curve") {
  // y = cos t + h cos 2t: in y^3, order 2 carries 3/4 (2 h) + 3/4 h^3 = 3/2 h; in y^2, order 3
  // carries h.
  const double h = 0.01;
  const std::vector<std::complex<double>> bent{0.0, 1.0, h, 0.0, 0.0};
  const auto f = curvature_floor(bent, 1e-6, 1e-7);
  CHECK(f[2] == doctest::Approx(1e-6 + 4e-7 * (1.5 * h + 0.75 * h * h * h)));
  CHECK(f[3] == doctest::Approx(2e-6 * h + 4e-7 * (0.25 + 0.75 * h * h)).epsilon(1e-6));
}
