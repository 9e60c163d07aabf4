// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/reading.h"

#include <doctest/doctest.h>

#include <array>
#include <cmath>

using namespace kneeprint;

TEST_CASE("a root sum of squares and its uncertainty, a worked example") {
  // JCGM 100:2008 eq. 10 by hand: ratios of 1, 0.5 and 0.1 %, each with u = 0.02 %. D = 1.122497216
  // %, and u(D) = sqrt(sum (r u)^2) / D is 0.02 % again; a Monte Carlo of 2e6 runs gave 0.019982 %.
  const std::array parts{RelativeReading{0.01, 0.0002}, RelativeReading{0.005, 0.0002},
                         RelativeReading{0.001, 0.0002}};
  const RelativeReading d = root_sum_of(parts);
  CHECK(std::abs(d.ratio - 0.01122497216) < 1e-11);
  CHECK(std::abs(d.u - 0.0002) < 1e-15);
  CHECK(std::abs(20.0 * std::log10(d.ratio) - -38.996294549) < 1e-8);
  CHECK(std::abs(kDbPerRelative * d.u / d.ratio - 0.154760110) < 1e-8);
}

TEST_CASE("what noise alone shows: the Rayleigh distribution's 95 %") {
  // sqrt(-2 ln 0.05) = 2.4477468307. For 4800 samples of sigma 1e-3, u = sigma sqrt(2 / 4800).
  const double u = 1e-3 * std::sqrt(2.0 / 4800.0);
  CHECK(std::abs(noise_threshold(u) - 4.996442296e-5) < 1e-13);
}

TEST_CASE("noise taken off an amplitude") {
  // E |A + n|^2 = A^2 + 2 u^2; the median of a Rice variate is near sqrt(A^2 + u^2) (3.1623 for A =
  // 3): u^2 taken off leaves A.
  CHECK(without_noise(std::sqrt(10.0), 1.0) == doctest::Approx(3.0).epsilon(1e-14));
  CHECK(without_noise(1.0, 2.0) == 0.0);
  CHECK(without_noise(1.0, 0.0) == 1.0);
}

TEST_CASE("an amplitude's upper limit would read lower in 2.5 % of cases") {
  // Rice 1944: density r exp(-(r^2 + a^2) / 2) I0(r a) for u = 1, here integrated by Simpson's
  // rule.
  const auto below = [](double read, double a) {
    constexpr int kSteps = 2000;
    double sum = 0.0;
    for (int i = 0; i <= kSteps; ++i) {
      const double r = read * i / kSteps;
      const double weight = i == 0 || i == kSteps ? 1.0 : i % 2 == 1 ? 4.0 : 2.0;
      sum += weight * r * std::exp(-0.5 * (r * r + a * a)) * std::cyl_bessel_i(0.0, r * a);
    }
    return sum * read / kSteps / 3.0;
  };
  constexpr double kU = 0.01;
  for (const double read : {1.5, 2.0, 2.4477, 4.0, 8.0}) {
    CAPTURE(read);
    const double limit = amplitude_upper_limit(read * kU, kU) / kU;
    CHECK(limit >= noise_threshold(1.0));
    CHECK(std::abs(below(read, limit) - 0.025) < 1e-4);
  }
  // Far above the noise a Rice variate is normal about sqrt(a^2 + 1): 1.96 u, on either side of the
  // place where the reading passes to that form.
  for (const double read : {900.0, 1100.0}) {
    CHECK(std::abs(amplitude_upper_limit(read, 1.0) - read - 1.959964) < 1e-3);
  }
  // So little that a limit from it alone would lie under what noise shows: that is stated instead.
  CHECK(amplitude_upper_limit(0.1 * kU, kU) == doctest::Approx(noise_threshold(kU)));
}
