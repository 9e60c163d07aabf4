// SPDX-License-Identifier: GPL-3.0-or-later
// At low drive the n-th harmonic rises by n dB per dB. How far from it a real curve is follows from
// the curve: H_n = sum_k 2 f^(n+2k)(b) (A/2)^(n+2k) / (k! (n+k)!) (Taylor series of f at the bias,
// cos^m expanded), so that the slope is n + 2 r A^2 + O(A^4), r = f^(n+2)(b) / (4 (n+1) f^(n)(b)).
#include <doctest/doctest.h>

#include <cmath>
#include <complex>
#include <functional>
#include <numbers>

#include "method/steady.h"
#include "method/synthetic.h"

using namespace kneeprint;
using kneeprint::testing::read;
using kneeprint::testing::response;
using kneeprint::testing::spec_for;

namespace {

struct Slopes {
  double level[8];     // dB of order n per dB of drive
  double relative[8];  // of order n over the fundamental
};

// Between `dbfs` less and plus `half_step`, as the tables have it.
Slopes slopes(const std::function<double(double)>& curve, double dbfs, double half_step) {
  Curves c[2];
  for (int i = 0; i < 2; ++i) {
    const TakeSpec spec = spec_for("steady", 997.0, dbfs + (i == 0 ? -half_step : half_step));
    c[i] = read(spec, response(spec, curve));
  }
  const double drive = c[1].levels.at(0).drive - c[0].levels.at(0).drive;
  Slopes s{};
  for (int n = 1; n < 8; ++n) {
    const auto at = static_cast<std::size_t>(n - 1);
    const HarmonicPoint &low = c[0].harmonics.at(at), &high = c[1].harmonics.at(at);
    s.level[n] = (*high.level - *low.level) / drive;
    s.relative[n] = (*high.relative_db - *low.relative_db) / drive;
  }
  return s;
}

double decibels(double ratio) { return 20.0 * std::log10(ratio); }

}  // namespace

TEST_CASE("arctan: the local slope is n / sqrt(1 + A^2)") {
  // From |H_n| = (2/n) t^n, t = (sqrt(1 + A^2) - 1) / A, odd n. It falls with A, so a step's slope
  // lies between those of its ends. Rounding leaves 1e-16 of full scale in a harmonic: 1e-5 dB and
  // less in all of these.
  const double half_step = 0.5;
  const auto curve = [](double x) { return std::atan(x); };
  const struct {
    double dbfs;
    int highest;
  } rows[] = {{-40.0, 3}, {-20.0, 5}, {-6.0, 7}};
  for (const auto& row : rows) {
    CAPTURE(row.dbfs);
    const Slopes s = slopes(curve, row.dbfs, half_step);
    const auto local = [&](int n, double db) {
      return n / std::sqrt(1.0 + std::pow(10.0, (row.dbfs + db) / 10.0));
    };
    for (int n = 1; n <= row.highest; n += 2) {
      CAPTURE(n);
      CHECK(s.level[n] < local(n, -half_step) + 1e-5);
      CHECK(s.level[n] > local(n, half_step) - 1e-5);
      // Over the fundamental n - 1, by the same.
      CHECK(s.relative[n] < local(n, -half_step) - local(1, -half_step) + 1e-5);
      CHECK(s.relative[n] > local(n, half_step) - local(1, half_step) - 1e-5);
    }
  }
  // A = 0.01: n dB/dB within n A^2 / 2.
  const Slopes low = slopes(curve, -40.0, half_step);
  CHECK(std::abs(low.level[1] - 1.0) < 1.2 * 0.5e-4);
  CHECK(std::abs(low.level[3] - 3.0) < 1.2 * 1.5e-4);
}

TEST_CASE("local slopes of tanh, arctan and x / sqrt(1 + x^2) at A = 0.1 and 0.5") {
  // d ln|H_n| / d ln A by quadrature in 40 digits. A step of 0.1 dB differs from the tangent by
  // s'' h^2 / 6, under 2e-5 for n <= 5 (s'' < 0.05 per dB^2 in all of these).
  const struct {
    std::function<double(double)> curve;
    double a, n1, n3, n5;
  } rows[] = {
      {[](double x) { return std::tanh(x); }, 0.1, 0.99502075, 2.99003487, 4.98588044},
      {[](double x) { return std::tanh(x); }, 0.5, 0.88683654, 2.77003180, 4.67294014},
      {[](double x) { return std::atan(x); }, 0.1, 0.99503719, 2.98511157, 4.97518595},
      {[](double x) { return std::atan(x); }, 0.5, 0.89442719, 2.68328157, 4.47213596},
      {[](double x) { return x / std::hypot(1.0, x); }, 0.1, 0.99256503, 2.98140102, 4.97106226},
      {[](double x) { return x / std::hypot(1.0, x); }, 0.5, 0.84587867, 2.60940038, 4.38964081},
  };
  for (const auto& row : rows) {
    CAPTURE(row.a);
    const Slopes s = slopes(row.curve, decibels(row.a), 0.05);
    CHECK(std::abs(s.level[1] - row.n1) < 2e-5);
    CHECK(std::abs(s.level[3] - row.n3) < 2e-5);
    CHECK(std::abs(s.level[5] - row.n5) < 2e-5);
  }
}

TEST_CASE("biased arctan: every order's slope, against the closed form and against n") {
  // H_n = (2/n) (-1)^(n+1) Im q^n, q = (c - sqrt(c^2 - alpha^2)) / alpha, c = 1 + jb, alpha = jA.
  const double bias = 0.2, dbfs = -20.0, half_step = 0.5;
  const auto magnitude = [&](int n, double a) {
    const std::complex<double> c(1.0, bias), alpha(0.0, a);
    std::complex<double> s = std::sqrt(c * c - alpha * alpha);
    if (std::abs(c - s) > std::abs(alpha)) s = -s;
    return 2.0 / n * std::abs(std::imag(std::pow((c - s) / alpha, n)));
  };
  const double low = std::pow(10.0, (dbfs - half_step) / 20.0);
  const double high = std::pow(10.0, (dbfs + half_step) / 20.0);
  const Slopes s =
      slopes([&](double x) { return std::atan(x + bias) - std::atan(bias); }, dbfs, half_step);
  const double a = std::pow(10.0, dbfs / 20.0);
  const double theta = std::atan(1.0 / bias);
  for (int n = 1; n <= 5; ++n) {
    CAPTURE(n);
    const double expected = decibels(magnitude(n, high) / magnitude(n, low)) / (2.0 * half_step);
    CHECK(std::abs(s.level[n] - expected) < 1e-6);
    // Derivatives of arctan: f^(n) = (-1)^(n-1) (n-1)! sin^n(theta) sin(n theta), cot theta = b.
    const double r =
        n * std::sin((n + 2) * theta) * std::pow(std::sin(theta), 2) / (4.0 * std::sin(n * theta));
    // The next term of the series and the width of the step: a tenth of the first.
    CHECK(std::abs(s.level[n] - n - 2.0 * r * a * a) < 0.1 * std::abs(2.0 * r * a * a) + 1e-6);
  }
}

TEST_CASE("biased tanh: n dB/dB within 2 r A^2") {
  const double bias = 0.2, a = 0.02, t = std::tanh(bias), u = 1.0 - t * t;
  // Derivatives of tanh at the bias, in t.
  const double f[] = {0.0,
                      u,
                      -2.0 * t * u,
                      u * (6.0 * t * t - 2.0),
                      u * (16.0 * t - 24.0 * t * t * t),
                      u * (16.0 - 120.0 * t * t + 120.0 * t * t * t * t)};
  const Slopes s =
      slopes([&](double x) { return std::tanh(x + bias) - std::tanh(bias); }, decibels(a), 0.5);
  for (int n = 1; n <= 3; ++n) {
    CAPTURE(n);
    const double first = 2.0 * f[n + 2] / (4.0 * (n + 1) * f[n]) * a * a;
    CHECK(std::abs(first) < 2e-3);
    CHECK(std::abs(s.level[n] - n - first) < 0.1 * std::abs(first) + 1e-6);
  }
  // Over the fundamental: n - 1.
  CHECK(std::abs(s.relative[2] - 1.0) < 2e-3);
  CHECK(std::abs(s.relative[3] - 2.0) < 2e-3);
}
