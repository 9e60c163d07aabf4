// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/harmonic_problem.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>

#include "sigmoid/synthetic_harmonics.h"

using namespace kneeprint;
using namespace kneeprint::testing;

namespace {

double sharpness_of(const SigmoidFamily& f) { return f.has_sharpness ? 2.6 : 1.0; }

// DC to order 6 at 4 drives, some without a sign.
std::vector<FitDatum> mixed_data(const SigmoidFamily& f) {
  Ladder ladder;
  ladder.drives = 4;
  ladder.first_order = 0;
  ladder.last_order = 6;
  ladder.lowest_u_db = ladder.highest_u_db = -90.0;
  std::vector<FitDatum> data = measured(f, {0.8, 1.9, 0.35, sharpness_of(f)}, 5, ladder);
  for (std::size_t i = 2; i < data.size(); i += 3) {
    data[i].has_sign = false;
    data[i].value = std::abs(data[i].value);
  }
  return data;
}

double sum_of_squares(const LeastSquaresProblem& p, std::span<const double> x) {
  std::vector<double> r(static_cast<std::size_t>(p.residuals));
  REQUIRE(p.evaluate(x, r, {}));
  double sum = 0.0;
  for (const double one : r) sum += one * one;
  return sum;
}

}  // namespace

TEST_CASE("data are gathered by drive, ascending, with their fundamentals") {
  const std::vector<FitDatum> data{{0.5, 2, 0.01, 1e-6, true},
                                   {0.5, 1, -0.4, 1e-6, true},
                                   {0.1, 1, 0.1, 1e-6, true},
                                   {0.2, 3, -0.03, 1e-4, true},
                                   {0.2, 0, 0.05, 2e-6, true}};
  const HarmonicData d(data);
  REQUIRE(d.rungs().size() == 3);
  CHECK(d.size() == 5);
  CHECK(d.orders() == 3);
  CHECK(d.strongest_input() == 0.5);
  CHECK(d.rungs()[0].fundamental == 0.1);
  CHECK(d.rungs()[1].fundamental == 0.05);  // none measured there: the largest value stands in
  CHECK(d.rungs()[2].fundamental == 0.4);
  CHECK(d.rungs()[0].distortion == 0.1);  // no order above the first: the fundamental stands in
  CHECK(d.rungs()[1].distortion == doctest::Approx(0.03));
  CHECK(d.rungs()[2].distortion == doctest::Approx(0.01));
  CHECK(d.largest_distortion() == doctest::Approx(0.1 / 0.4));
  CHECK(d.smallest_sigma(0.0) == doctest::Approx(1e-6 / 0.4));
  CHECK(d.smallest_sigma(1.0) == doctest::Approx(0.01 / 0.4).epsilon(1e-6));
  CHECK(d.log_variances(0.0) ==
        doctest::Approx(2.0 * (3.0 * std::log(1e-6) + std::log(1e-4) + std::log(2e-6))));
}

TEST_CASE("the full Jacobian is that of the residuals, for every family") {
  constexpr double kStep = 1e-6;
  for (const SigmoidFamily& f : sigmoid_families()) {
    CAPTURE(f.id);
    const std::vector<FitDatum> data = mixed_data(f);
    const HarmonicData harmonics(data);
    HarmonicProblem problem(harmonics, f);
    const LeastSquaresProblem p = problem.over_all(1e-3);
    std::vector<double> x{std::log(0.7), std::log(2.1), 0.3};
    if (f.has_sharpness) x.push_back(std::log(2.2));
    const auto n = static_cast<std::size_t>(p.residuals);
    std::vector<double> r(n), above(n), below(n), jacobian(n * x.size());
    REQUIRE(p.evaluate(x, r, jacobian));
    for (std::size_t j = 0; j < x.size(); ++j) {
      std::vector<double> up = x, down = x;
      up[j] += kStep;
      down[j] -= kStep;
      REQUIRE(p.evaluate(up, above, {}));
      REQUIRE(p.evaluate(down, below, {}));
      for (std::size_t i = 0; i < n; ++i) {
        CAPTURE(i);
        CAPTURE(j);
        const double slope = (above[i] - below[i]) / (2.0 * kStep);
        // Residuals of size up to 1e3 with a quadrature error of 1e-3 of one at most, far less
        // here.
        CHECK(std::abs(jacobian[i * x.size() + j] - slope) < 1e-5 * (1.0 + std::abs(slope)));
      }
    }
  }
}

TEST_CASE("over shapes, the gradient is that of the sum of squares with the best limit") {
  constexpr double kStep = 1e-6;
  for (const SigmoidFamily& f : sigmoid_families()) {
    CAPTURE(f.id);
    const std::vector<FitDatum> data = mixed_data(f);
    const HarmonicData harmonics(data);
    HarmonicProblem problem(harmonics, f);
    const LeastSquaresProblem p = problem.over_shapes(1e-3);
    Shape shape{std::log(2.1), 0.3};
    if (f.has_sharpness) shape.push_back(std::log(2.2));
    const auto n = static_cast<std::size_t>(p.residuals);
    std::vector<double> r(n), jacobian(n * shape.size());
    REQUIRE(p.evaluate(shape, r, jacobian));
    for (std::size_t j = 0; j < shape.size(); ++j) {
      double gradient = 0.0;
      for (std::size_t i = 0; i < n; ++i) gradient += 2.0 * r[i] * jacobian[i * shape.size() + j];
      Shape up = shape, down = shape;
      up[j] += kStep;
      down[j] -= kStep;
      const double slope = (sum_of_squares(p, up) - sum_of_squares(p, down)) / (2.0 * kStep);
      CHECK(gradient == doctest::Approx(slope).epsilon(1e-6));
    }
    // No other limit does better.
    const SigmoidParameters best = problem.parameters(shape, 1e-3);
    const LeastSquaresProblem all = problem.over_all(1e-3);
    std::vector<double> x{std::log(best.limit)};
    x.insert(x.end(), shape.begin(), shape.end());
    const double least = sum_of_squares(p, shape);
    CHECK(sum_of_squares(all, x) == doctest::Approx(least).epsilon(1e-10));
    for (const double other : {-1e-3, 1e-3}) {
      std::vector<double> moved = x;
      moved[0] += other;
      CHECK(sum_of_squares(all, moved) > least);
    }
  }
}

TEST_CASE("starts: the bias has the sign that the even harmonics ask for") {
  for (const SigmoidFamily& f : sigmoid_families()) {
    for (const double bias : {-0.4, 0.4}) {
      CAPTURE(f.id);
      CAPTURE(bias);
      const std::vector<FitDatum> data = measured(f, {1.0, 1.0, bias, sharpness_of(f)}, 3);
      const HarmonicData harmonics(data);
      HarmonicProblem problem(harmonics, f);
      const std::vector<Shape> starts = problem.starts(1e-3);
      REQUIRE(starts.size() >= 3);
      CHECK(starts.front()[1] * bias > 0.0);
    }
  }
}

TEST_CASE("a shape whose rest lies on the flat end has no value, and is called degenerate") {
  const SigmoidFamily& f = *find_family("erf");
  const std::vector<FitDatum> data = mixed_data(f);
  const HarmonicData harmonics(data);
  HarmonicProblem problem(harmonics, f);
  const LeastSquaresProblem p = problem.over_shapes(0.0);
  std::vector<double> r(static_cast<std::size_t>(p.residuals));
  CHECK(!p.evaluate(Shape{0.0, 5.0}, r, {}));
  CHECK(p.evaluate(Shape{0.0, 2.0}, r, {}));
  CHECK(problem.degenerate(Shape{0.0, 5.0}));
  CHECK(problem.degenerate(Shape{p.low[0], 0.0}));
  CHECK(!problem.degenerate(Shape{0.0, 0.3}));
}
