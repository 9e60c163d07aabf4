// SPDX-License-Identifier: GPL-3.0-or-later
#include "quantity/chebyshev.h"

#include <doctest/doctest.h>

#include <cmath>

namespace kneeprint {

TEST_CASE("a polynomial of the number of points is met exactly, at the points and between them") {
  const auto f = [](double x) { return 3.0 - 2.0 * x + 0.5 * std::pow(x, 4); };
  const ChebyshevCurve curve(f, -1.0, 3.0, 4);
  CHECK(curve.low() == -1.0);
  CHECK(curve.high() == 3.0);
  CHECK(curve(-1.0) == f(-1.0));
  CHECK(curve(3.0) == f(3.0));
  for (double x = -1.0; x <= 3.0; x += 0.01) CHECK(std::abs(curve(x) - f(x)) < 1e-13);
}

TEST_CASE("the error of an analytic function falls as its poles allow") {
  // 1 / (1 + x^2) has poles at +-i: the error falls by 1 + sqrt 2 per point (Trefethen 2013,
  // theorem 8.2); 44 points leave (1 + sqrt 2)^-44 = 1.4e-17 times a small factor.
  const auto f = [](double x) { return 1.0 / (1.0 + x * x); };
  const ChebyshevCurve coarse(f, -1.0, 1.0, 10), fine(f, -1.0, 1.0, 44);
  double worst_coarse = 0.0, worst_fine = 0.0;
  for (double x = -1.0; x <= 1.0; x += 0.003) {
    worst_coarse = std::max(worst_coarse, std::abs(coarse(x) - f(x)));
    worst_fine = std::max(worst_fine, std::abs(fine(x) - f(x)));
  }
  CHECK(worst_coarse > 1e-5);
  CHECK(worst_coarse < 1e-3);
  CHECK(worst_fine < 1e-15);
}

}  // namespace kneeprint
