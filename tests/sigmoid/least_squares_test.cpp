// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/least_squares.h"

#include <doctest/doctest.h>

#include <cmath>
#include <functional>
#include <string>

using namespace kneeprint;

namespace {

// Data sets, starts and certified values: NIST/ITL Statistical Reference Datasets, Nonlinear
// Regression (StRD, public domain): Rat42.dat, Rat43.dat, Misra1a.dat.
struct Certified {
  std::string name;
  std::vector<double> x, y;
  std::vector<std::vector<double>> starts;
  std::vector<double> values, deviations;
  double sum_of_squares;
  /// Model at x and its derivatives by the parameters.
  std::function<double(double x, std::span<const double> b, std::span<double> by)> model;
};

double rat42(double x, std::span<const double> b, std::span<double> by) {
  const double e = std::exp(b[1] - b[2] * x), s = 1.0 / (1.0 + e);
  by[0] = s;
  by[1] = -b[0] * s * s * e;
  by[2] = b[0] * s * s * e * x;
  return b[0] * s;
}

double rat43(double x, std::span<const double> b, std::span<double> by) {
  const double e = std::exp(b[1] - b[2] * x);
  const double s = std::pow(1.0 + e, -1.0 / b[3]);
  const double inner = -b[0] * s / b[3] * e / (1.0 + e);
  by[0] = s;
  by[1] = inner;
  by[2] = -x * inner;
  by[3] = b[0] * s * std::log1p(e) / (b[3] * b[3]);
  return b[0] * s;
}

double misra1a(double x, std::span<const double> b, std::span<double> by) {
  const double e = std::exp(-b[1] * x);
  by[0] = 1.0 - e;
  by[1] = b[0] * x * e;
  return b[0] * (1.0 - e);
}

std::vector<Certified> certified() {
  return {
      {"Rat42",
       {9, 14, 21, 28, 42, 57, 63, 70, 79},
       {8.93, 10.8, 18.59, 22.33, 39.35, 56.11, 61.73, 64.62, 67.08},
       {{100, 1, 0.1}, {75, 2.5, 0.07}},
       {7.2462237576E+01, 2.6180768402E+00, 6.7359200066E-02},
       {1.7340283401E+00, 8.8295217536E-02, 3.4465663377E-03},
       8.0565229338E+00,
       rat42},
      {"Rat43",
       {1, 2, 3, 4, 5, 6, 7, 8, 9, 10, 11, 12, 13, 14, 15},
       {16.08, 33.83, 65.8, 97.2, 191.55, 326.2, 386.87, 520.53, 590.03, 651.92, 724.93, 699.56,
        689.96, 637.56, 717.41},
       {{100, 10, 1, 1}, {700, 5, 0.75, 1.3}},
       {6.9964151270E+02, 5.2771253025E+00, 7.5962938329E-01, 1.2792483859E+00},
       {1.6302297817E+01, 2.0828735829E+00, 1.9566123451E-01, 6.8761936385E-01},
       8.7864049080E+03,
       rat43},
      {"Misra1a",
       {77.6, 114.9, 141.1, 190.8, 239.9, 289, 332.8, 378.4, 434.8, 477.3, 536.8, 593.1, 689.1,
        760},
       {10.07, 14.73, 17.94, 23.93, 29.61, 35.18, 40.02, 44.82, 50.76, 55.05, 61.01, 66.4, 75.47,
        81.78},
       {{500, 0.0001}, {250, 0.0005}},
       {2.3894212918E+02, 5.5015643181E-04},
       {2.7070075241E+00, 7.2668688436E-06},
       1.2455138894E-01,
       misra1a},
  };
}

LeastSquaresProblem problem_of(const Certified& c) {
  LeastSquaresProblem p;
  p.residuals = static_cast<int>(c.x.size());
  p.parameters = static_cast<int>(c.values.size());
  p.evaluate = [&c](std::span<const double> b, std::span<double> r, std::span<double> jacobian) {
    std::vector<double> by(b.size());
    for (std::size_t i = 0; i < c.x.size(); ++i) {
      r[i] = c.model(c.x[i], b, by) - c.y[i];
      if (!std::isfinite(r[i])) return false;
      if (jacobian.empty()) continue;
      std::copy(by.begin(), by.end(), jacobian.begin() + static_cast<long>(i * b.size()));
    }
    return true;
  };
  return p;
}

// y = x0 + x1 t at t = 0, 1, 2, 3.
LeastSquaresProblem line() {
  LeastSquaresProblem p{4, 2, {}, {}, {}};
  p.evaluate = [](std::span<const double> x, std::span<double> r, std::span<double> jacobian) {
    constexpr double kY[] = {1.0, 3.0, 2.0, 5.0};
    for (std::size_t i = 0; i < 4; ++i) {
      const auto t = static_cast<double>(i);
      r[i] = x[0] + x[1] * t - kY[i];
      if (jacobian.empty()) continue;
      jacobian[2 * i] = 1.0;
      jacobian[2 * i + 1] = t;
    }
    return true;
  };
  return p;
}

}  // namespace

TEST_CASE("NIST certified fits, from both published starts") {
  for (const Certified& c : certified()) {
    const LeastSquaresProblem problem = problem_of(c);
    for (const std::vector<double>& start : c.starts) {
      CAPTURE(c.name);
      CAPTURE(start[0]);
      const LeastSquaresSolution s = least_squares(problem, start);
      CHECK(s.converged);
      CHECK(std::abs(s.sum_of_squares / c.sum_of_squares - 1.0) < 1e-9);
      const double variance = s.sum_of_squares / static_cast<double>(c.x.size() - c.values.size());
      const std::vector<double> covariance = inverse_fisher(problem, s.x);
      for (std::size_t j = 0; j < c.values.size(); ++j) {
        CAPTURE(j);
        CHECK(std::abs(s.x[j] / c.values[j] - 1.0) < 1e-7);  // seven digits
        const double deviation = std::sqrt(covariance[j * c.values.size() + j] * variance);
        CHECK(std::abs(deviation / c.deviations[j] - 1.0) < 1e-5);  // five
      }
    }
  }
}

TEST_CASE("a straight line: normal equations by hand") {
  const LeastSquaresSolution s = least_squares(line(), {40.0, -9.0});
  CHECK(s.converged);
  CHECK(s.x[0] == doctest::Approx(1.1).epsilon(1e-10));
  CHECK(s.x[1] == doctest::Approx(1.1).epsilon(1e-10));
  // Residuals 0.1, -0.8, 1.3, -0.6.
  CHECK(s.sum_of_squares == doctest::Approx(2.7).epsilon(1e-10));
  // J^T J = (4 6; 6 14), inverse (0.7 -0.3; -0.3 0.2).
  const std::vector<double> c = inverse_fisher(line(), s.x);
  CHECK(c[0] == doctest::Approx(0.7).epsilon(1e-12));
  CHECK(c[1] == doctest::Approx(-0.3).epsilon(1e-12));
  CHECK(c[2] == doctest::Approx(-0.3).epsilon(1e-12));
  CHECK(c[3] == doctest::Approx(0.2).epsilon(1e-12));
}

TEST_CASE("bounds hold, and a start outside is moved inside") {
  LeastSquaresProblem p = line();
  p.low = {-10.0, -10.0};
  p.high = {10.0, 0.5};
  const LeastSquaresSolution s = least_squares(p, {0.0, 3.0});
  CHECK(s.converged);
  CHECK(s.x[1] == doctest::Approx(0.5).epsilon(1e-12));
  CHECK(s.x[0] == doctest::Approx(2.75 - 0.5 * 1.5).epsilon(1e-9));  // mean y - slope * mean t
}

TEST_CASE("a start without a value comes back, not converged") {
  LeastSquaresProblem p = line();
  p.evaluate = [](std::span<const double>, std::span<double>, std::span<double>) { return false; };
  const LeastSquaresSolution s = least_squares(p, {1.0, 2.0});
  CHECK(!s.converged);
  CHECK(std::isinf(s.sum_of_squares));
  CHECK(s.x == std::vector<double>{1.0, 2.0});
}

TEST_CASE("a parameter that the data do not see has a large, finite variance") {
  LeastSquaresProblem p = line();
  const auto seen = p.evaluate;
  p.evaluate = [seen](std::span<const double> x, std::span<double> r, std::span<double> jacobian) {
    seen(x, r, jacobian);
    for (std::size_t i = 0; i < 4 && !jacobian.empty(); ++i) jacobian[2 * i + 1] = 0.0;
    return true;
  };
  const std::vector<double> c = inverse_fisher(p, std::vector<double>{0.0, 0.0});
  CHECK(c[0] == doctest::Approx(0.25).epsilon(1e-12));
  CHECK(std::isfinite(c[3]));
  CHECK(c[3] > 1e12);
}
