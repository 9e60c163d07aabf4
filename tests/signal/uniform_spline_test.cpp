// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/uniform_spline.h"

#include <doctest/doctest.h>

#include <cmath>
#include <numbers>
#include <random>
#include <stdexcept>

namespace kneeprint {
namespace {

double quintic(double x) { return ((((0.3 * x - 1.0) * x + 0.5) * x + 2.0) * x - 1.0) * x + 0.7; }
double quintic_slope(double x) { return (((1.5 * x - 4.0) * x + 1.5) * x + 4.0) * x - 1.0; }

// Least squares to f at every 1/100 from -1 to 2.
template <class F>
UniformSpline fitted(std::size_t intervals, F f) {
  UniformSpline s(-1.0, 2.0, intervals);
  SplineFit fit(s);
  for (int i = 0; i <= 300; ++i) {
    const double x = -1.0 + 0.01 * i;
    fit.add(x, 1.0, f(x));
  }
  s.coefficients() = fit.solve();
  return s;
}

}  // namespace

TEST_CASE("the weights sum to 1, and a quintic with its slope is met, beyond the ends too") {
  for (const std::size_t intervals : {1, 2, 7, 20}) {
    const UniformSpline s = fitted(intervals, quintic);
    CHECK(s.size() == intervals + 5);
    for (const double x : {-1.1, -1.0, -0.37, 0.0, 0.5, 1.99, 2.0, 2.05}) {
      CAPTURE(x);
      double sum = 0.0;
      for (const double w : s.at(x).weights) sum += w;
      CHECK(std::abs(sum - 1.0) < 1e-12);
      // The outermost splines weigh 1e-7 and less of an inner one; what holds coefficients that no
      // look weighs, 1e-14 of the largest weight, moves them by 1e-6.
      CHECK(std::abs(s.value(x) - quintic(x)) < 1e-5);
      CHECK(std::abs(s.slope(x) - quintic_slope(x)) < 1e-4);
    }
  }
  // Greatest less least at the knots: a straight line's ends.
  CHECK(fitted(6, [](double x) { return 2.0 * x; }).extent() == doctest::Approx(6.0));
}

TEST_CASE("a sine is met to sqrt(2) f^6 of its rms, f in cycles per interval") {
  constexpr std::size_t kIntervals = 30;
  for (const double f : {0.1, 0.16, 0.2}) {
    CAPTURE(f);
    const double turn = 2.0 * std::numbers::pi * f * kIntervals / 3.0;
    const auto sine = [&](double x) { return std::sin(turn * x + 0.4); };
    const UniformSpline s = fitted(kIntervals, sine);
    double squares = 0.0;
    int count = 0;
    // Away from the ends, where less is known.
    for (double x = -0.5; x < 1.5; x += 0.001, ++count) {
      squares += std::pow(s.value(x) - sine(x), 2);
    }
    const double relative = std::sqrt(squares / count) * std::numbers::sqrt2;
    // The next term of the series is a share of some f^2 more.
    CHECK(relative == doctest::Approx(std::numbers::sqrt2 * std::pow(f, 6)).epsilon(0.25));
  }
}

TEST_CASE("values at the centres are followed: parabolas exactly, smooth curves nearly") {
  UniformSpline s(0.0, 10.0, 20);
  std::vector<double> values, waves;
  for (std::size_t k = 0; k < s.size(); ++k) {
    const double x = s.centre(k);
    values.push_back(1.0 + x - 0.3 * x * x);
    waves.push_back(std::sin(x));
  }
  CHECK(s.centre(0) == doctest::Approx(-1.0));
  CHECK(s.centre(s.size() - 1) == doctest::Approx(11.0));
  s.follow(values);
  for (double x = 1.6; x < 8.5; x += 0.1)
    CHECK(s.value(x) == doctest::Approx(1.0 + x - 0.3 * x * x));
  s.follow(waves);
  for (double x = 1.6; x < 8.5; x += 0.1) CHECK(std::abs(s.value(x) - std::sin(x)) < 0.01);
}

TEST_CASE("weighted looks, coefficients that none weighs, and how far a curve is from a constant") {
  UniformSpline s(0.0, 100.0, 10);
  SplineFit fit(s);
  CHECK(fit.solve() == std::vector<double>(s.size(), 0.0));
  CHECK(fit.departure(std::vector<double>(s.size(), 3.0)) == 0.0);
  std::mt19937 random(4);
  std::normal_distribution<double> normal(0.0, 1.0);
  std::vector<double> xs, gs;
  for (int i = 0; i < 4000; ++i) {
    // Nothing is seen of the last third.
    const double x = 0.016 * i, g = normal(random);
    xs.push_back(x);
    gs.push_back(g);
    fit.add(x, g, g * (2.0 + 0.01 * x));
  }
  s.coefficients() = fit.solve();
  for (const double x : {0.0, 10.0, 33.3, 60.0})
    CHECK(std::abs(s.value(x) - 2.0 - 0.01 * x) < 1e-6);
  double weight = 0.0, mean = 0.0;
  for (std::size_t i = 0; i < xs.size(); ++i) {
    weight += gs[i] * gs[i];
    mean += gs[i] * gs[i] * s.value(xs[i]);
  }
  mean /= weight;
  double departure = 0.0;
  for (std::size_t i = 0; i < xs.size(); ++i) {
    departure += std::pow(gs[i] * (s.value(xs[i]) - mean), 2);
  }
  CHECK(fit.weight() == doctest::Approx(weight));
  CHECK(fit.departure(s.coefficients()) == doctest::Approx(departure).epsilon(1e-6));
}

TEST_CASE("a spline without an interval is a mistake of ours") {
  CHECK_THROWS_AS(UniformSpline(1.0, 1.0, 3), std::invalid_argument);
  CHECK_THROWS_AS(UniformSpline(0.0, 1.0, 0), std::invalid_argument);
  UniformSpline s(0.0, 1.0, 1);
  CHECK_THROWS_AS(s.follow({1.0, 2.0}), std::invalid_argument);
}

}  // namespace kneeprint
