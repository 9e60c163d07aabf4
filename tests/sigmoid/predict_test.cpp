// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/predict.h"

#include <doctest/doctest.h>

#include <array>
#include <cmath>
#include <numbers>

using namespace kneeprint;

namespace {

double clip(double x) { return x > 1.0 ? 1.0 : x < -1.0 ? -1.0 : x; }

double thd_f(const std::vector<double>& h) {
  double sum = 0.0;
  for (std::size_t n = 2; n < h.size(); ++n) sum += h[n] * h[n];
  return std::sqrt(sum) / std::abs(h[1]);
}

}  // namespace

TEST_CASE("polynomial of degree 5: exact harmonics, by algebra") {
  // a = (0, 1, 0.1, -0.05, 0.02, 0.01), A = 0.8, about b = 0 and b = 0.3: shift to the bias, then
  // H2 = c2 A^2/2 + c4 A^4/2 and so on; all are exact decimals.
  const auto poly = [](double x) {
    return x * (1.0 + x * (0.1 + x * (-0.05 + x * (0.02 + x * 0.01))));
  };
  const std::array<double, 6> at_0{0.035072, 0.782848, 0.036096, -0.005376, 0.001024, 0.0002048};
  const std::array<double, 6> at_03{0.3351323, 0.834772, 0.029088, -0.001152, 0.001792, 0.0002048};
  const auto h0 = sine_harmonics(poly, 0.8, 7);
  const auto h03 = sine_harmonics([&](double x) { return poly(0.3 + x); }, 0.8, 7);
  for (std::size_t n = 0; n < 6; ++n) {
    CHECK(std::abs(h0[n] - at_0[n]) < 1e-14);
    CHECK(std::abs(h03[n] - at_03[n]) < 1e-14);
  }
  CHECK(std::abs(h0[6]) < 1e-15);
  CHECK(std::abs(h03[7]) < 1e-15);
}

TEST_CASE("Chebyshev polynomial T_n gives harmonic n alone") {
  // T_n(cos theta) = cos n theta: NIST DLMF 18.5.1 (number from memory).
  for (int n = 0; n <= 10; ++n) {
    const auto chebyshev = [n](double x) {
      double before = 1.0, now = x;
      if (n == 0) return 1.0;
      for (int k = 1; k < n; ++k) {
        const double next = 2.0 * x * now - before;
        before = now;
        now = next;
      }
      return now;
    };
    const auto h = sine_harmonics(chebyshev, 1.0, 12);
    for (int k = 0; k <= 12; ++k) {
      CHECK(std::abs(h[static_cast<std::size_t>(k)] - (k == n ? 1.0 : 0.0)) < 1e-13);
    }
  }
  // Off its amplitude, T5 at A = 0.9: 5A - 15A^3 + 10A^5, -5A^3 + 5A^5, A^5.
  const auto h =
      sine_harmonics([](double x) { return x * (5.0 + x * x * (-20.0 + 16.0 * x * x)); }, 0.9, 5);
  CHECK(std::abs(h[1] + 0.5301) < 1e-14);
  CHECK(std::abs(h[3] + 0.69255) < 1e-14);
  CHECK(std::abs(h[5] - 0.59049) < 1e-14);
}

TEST_CASE("exponential: modified Bessel functions") {
  // e^{A cos theta} = I_0(A) + 2 sum I_n(A) cos n theta: NIST DLMF 10.35.2.
  constexpr double kBias = 0.3;
  for (const double a : {0.1, 0.5, 1.0, 2.0, 5.0}) {
    const auto h = sine_harmonics([](double x) { return std::exp(kBias + x); }, a, 7);
    for (int n = 0; n <= 7; ++n) {
      const double bessel = std::cyl_bessel_i(static_cast<double>(n), a);
      const double expected = (n == 0 ? 1.0 : 2.0) * std::exp(kBias) * bessel;
      // Rounding of samples up to e^(A+b), 1e-16 each.
      CHECK(std::abs(h[static_cast<std::size_t>(n)] - expected) < 1e-14 * std::exp(a));
    }
  }
  // I_7(1), Abramowitz & Stegun table 9.9, more digits by mpmath.
  const auto h = sine_harmonics([](double x) { return std::exp(x); }, 1.0, 7);
  CHECK(std::abs(h[7] - 2.0 * 1.599218231201e-6) < 1e-15);
}

TEST_CASE("hard clipper: closed form, aliasing of the rule included") {
  // r = 1/A, phi = arccos r: H1 = (2A/pi)(asin r + r sqrt(1 - r^2)), odd n >= 3:
  // H_n = (2A/(pi n)) (sin((n+1) phi)/(n+1) - sin((n-1) phi)/(n-1)); even n: 0.
  const auto closed = [](int n, double a) {
    const double r = 1.0 / a, phi = std::acos(r), pi = std::numbers::pi;
    if (n == 1) return 2.0 * a / pi * (std::asin(r) + r * std::sqrt(1.0 - r * r));
    return 2.0 * a / (pi * n) *
           (std::sin((n + 1) * phi) / (n + 1) - std::sin((n - 1) * phi) / (n - 1));
  };
  CHECK(std::abs(closed(1, 2.0) - 1.217995562088) < 1e-12);  // by piecewise quadrature at 30 digits
  CHECK(std::abs(closed(3, 2.0) + 0.275664447711) < 1e-12);
  constexpr int kPoints = 8192;
  for (const double a : {1.1, 1.5, 2.0, 5.0}) {
    const auto h = sine_harmonics(clip, a, 11, kPoints);
    for (int n = 1; n <= 11; n += 2) {
      // |H_m| <= 4A/(pi m^2) about m = kPoints, 2 kPoints, ...: both sides of each, sum of 1/k^2.
      const double alias = 2.0 * 4.0 * a / std::numbers::pi / std::pow(kPoints - 12.0, 2) * 1.645;
      CHECK(std::abs(h[static_cast<std::size_t>(n)] - closed(n, a)) < alias);
    }
    for (int n = 0; n <= 10; n += 2) CHECK(std::abs(h[static_cast<std::size_t>(n)]) < 1e-14);
  }
}

TEST_CASE("square-wave limit: THD_F 48.34 %") {
  // sqrt(pi^2/8 - 1); orders above 2047 carry 4/pi^2 / 2047 of the power: 2e-4 of the sum.
  const double limit = std::sqrt(std::numbers::pi * std::numbers::pi / 8.0 - 1.0);
  CHECK(limit == doctest::Approx(0.483425847608679).epsilon(1e-12));
  const auto h = sine_harmonics([](double x) { return clip(1e6 * x); }, 1.0, 2047, 65536);
  CHECK(h[1] == doctest::Approx(4.0 / std::numbers::pi).epsilon(1e-6));
  CHECK(h[3] == doctest::Approx(-4.0 / std::numbers::pi / 3.0).epsilon(1e-6));
  CHECK(std::abs(thd_f(h) - limit) < 4e-4);
  // Summed to order 11 it is 43.83 %.
  const std::vector<double> low(h.begin(), h.begin() + 12);
  CHECK(thd_f(low) == doctest::Approx(0.438325696485).epsilon(1e-6));
}

TEST_CASE("two tones through a cubic: products by trigonometry") {
  // y = x + 0.02 x^2 - 0.01 x^3; f2 +- f1: a2 U1 U2, f2 +- 2 f1: 3/4 a3 U1^2 U2, and so on.
  const auto cubic = [](double x) { return x * (1.0 + x * (0.02 - 0.01 * x)); };
  const std::vector<std::pair<int, int>> wanted{{1, 0},  {0, 1}, {-1, 1}, {1, 1}, {-2, 1}, {2, 1},
                                                {-1, 2}, {2, 0}, {0, 2},  {3, 0}, {0, 3},  {2, 2}};
  const auto p = two_tone_products(cubic, 0.8, 0.2, wanted);
  const std::array expected{0.79568,  0.19802, 0.0032, 0.0032,   -0.00096, -0.00096,
                            -0.00024, 0.0064,  0.0004, -0.00128, -0.00002, 0.0};
  for (std::size_t i = 0; i < wanted.size(); ++i) {
    CAPTURE(wanted[i].first);
    CAPTURE(wanted[i].second);
    CHECK(std::abs(p[i] - expected[i]) < 1e-15);
  }
  // Equal tones: f2 - f1 a2 U^2, 2 f1 - f2 3/4 a3 U^3.
  const auto twin = two_tone_products(cubic, 0.5, 0.5, {{1, 0}, {-1, 1}, {2, -1}, {-1, 2}});
  CHECK(std::abs(twin[0] - 0.4971875) < 1e-15);
  CHECK(std::abs(twin[1] - 0.005) < 1e-15);
  CHECK(std::abs(twin[2] + 0.0009375) < 1e-15);
  CHECK(std::abs(twin[3] + 0.0009375) < 1e-15);
}

TEST_CASE("two tones through an exponential: products of Bessel functions") {
  // e^{U1 cos a} e^{U2 cos b}: DLMF 10.35.2 twice; the product k1, k2 is 2 I_k1(U1) I_k2(U2).
  const std::vector<std::pair<int, int>> wanted{{1, 0}, {0, 2}, {-1, 1}, {2, 1}, {3, -4}};
  const auto p = two_tone_products([](double x) { return std::exp(x); }, 1.3, 0.4, wanted);
  for (std::size_t i = 0; i < wanted.size(); ++i) {
    const auto [k1, k2] = wanted[i];
    const double expected =
        2.0 * std::cyl_bessel_i(std::abs(k1), 1.3) * std::cyl_bessel_i(std::abs(k2), 0.4);
    CHECK(std::abs(p[i] - expected) < 1e-14);
  }
}
