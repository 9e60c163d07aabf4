// SPDX-License-Identifier: GPL-3.0-or-later
// Every family of the registry: none escapes.
#include <doctest/doctest.h>

#include <cmath>
#include <set>
#include <string>
#include <vector>

#include "sigmoid/family.h"
#include "sigmoid/predict.h"
#include "sigmoid/reference_harmonics.h"

using namespace kneeprint;
using namespace kneeprint::testing;

namespace {

std::vector<double> sharpnesses(const SigmoidFamily& f) {
  if (!f.has_sharpness) return {1.0};
  return {f.sharpness_low, 1.37, 2.0, 3.5, 6.0, 17.0, f.sharpness_high};
}

// Both sides of 1, where the algebraic family changes its formula, and of 0.
const std::vector<double> kAbscissae{1e-9, 1e-3,     0.1, 0.4, 0.9, 0.999999,
                                     1.0,  1.000001, 1.2, 2.0, 5.0, 30.0};

}  // namespace

TEST_CASE("families have their own ids, sources and an order of pages") {
  std::vector<std::string> ids;
  for (const SigmoidFamily& f : sigmoid_families()) {
    ids.emplace_back(f.id);
    CHECK(find_family(f.id) == &f);
    CHECK(!f.title.empty());
    CHECK(!f.formula.empty());
    CHECK(!f.source.empty());
  }
  CHECK(ids == std::vector<std::string>{"tanh", "atan", "algebraic", "erf"});
  CHECK(find_family("linear") == nullptr);
}

TEST_CASE("every family is normalised: slope 1 at the centre, ends at -1 and +1") {
  for (const SigmoidFamily& f : sigmoid_families()) {
    for (const double p : sharpnesses(f)) {
      CAPTURE(f.id);
      CAPTURE(p);
      CHECK(f.value(0.0, p) == 0.0);
      CHECK(f.slope(0.0, p) == 1.0);
      CHECK(f.by_sharpness(0.0, p) == 0.0);
      for (const double z : {1e8, 1e150, 1e300}) {
        // atan and algebraic with p = 1 approach their ends as slowly as 1/z.
        CHECK(std::abs(f.value(z, p) - 1.0) <= 1.0 / z + 1e-15);
        CHECK(std::abs(f.value(-z, p) + 1.0) <= 1.0 / z + 1e-15);
        CHECK(f.slope(z, p) >= 0.0);
        CHECK(f.slope(z, p) <= 1.0 / z);
        CHECK(std::abs(f.by_sharpness(z, p)) <= 1e-6);
      }
    }
  }
}

TEST_CASE("every family is odd and rises") {
  for (const SigmoidFamily& f : sigmoid_families()) {
    for (const double p : sharpnesses(f)) {
      CAPTURE(f.id);
      CAPTURE(p);
      double before = 0.0;
      for (const double z : kAbscissae) {
        CAPTURE(z);
        CHECK(f.value(-z, p) == -f.value(z, p));
        CHECK(f.slope(-z, p) == f.slope(z, p));
        CHECK(f.by_sharpness(-z, p) == -f.by_sharpness(z, p));
        CHECK(f.value(z, p) >= before);
        if (z < 2.0) CHECK(f.slope(z, p) > 0.0);
        before = f.value(z, p);
      }
    }
  }
}

TEST_CASE("slopes are the derivatives, by central differences") {
  // Step h: truncation h^2 S'''/6 (S''' < 1e3 for p = 40) and rounding 1e-16/h stay under 1e-8.
  constexpr double kStep = 2e-6;
  for (const SigmoidFamily& f : sigmoid_families()) {
    for (const double p : sharpnesses(f)) {
      for (const double z : {-2.3, -0.7, 0.013, 0.5, 0.97, 1.03, 1.8, 9.0}) {
        CAPTURE(f.id);
        CAPTURE(p);
        CAPTURE(z);
        const double by_z = (f.value(z + kStep, p) - f.value(z - kStep, p)) / (2.0 * kStep);
        CHECK(std::abs(f.slope(z, p) - by_z) < 1e-8);
        const double by_p = (f.value(z, p + kStep) - f.value(z, p - kStep)) / (2.0 * kStep);
        CHECK(std::abs(f.by_sharpness(z, p) - by_p) < 1e-8);
      }
    }
  }
}

TEST_CASE("the algebraic family in closed form") {
  const SigmoidFamily& f = *find_family("algebraic");
  for (const double z : {-3.0, -0.5, 0.25, 1.0, 7.0}) {
    CHECK(f.value(z, 1.0) == doctest::Approx(z / (1.0 + std::abs(z))).epsilon(1e-15));
    CHECK(f.value(z, 2.0) == doctest::Approx(z / std::sqrt(1.0 + z * z)).epsilon(1e-15));
    CHECK(f.slope(z, 2.0) == doctest::Approx(std::pow(1.0 + z * z, -1.5)).epsilon(1e-14));
  }
  CHECK(f.value(1.0, 40.0) == doctest::Approx(std::pow(2.0, -1.0 / 40.0)).epsilon(1e-15));
}

TEST_CASE("harmonics of the families against the reference tables") {
  for (const ReferenceTable& t : kReferenceTables) {
    const SigmoidFamily& f = *find_family(t.family);
    for (const ReferenceHarmonics& row : t.rows) {
      const auto curve = [&](double x) {
        return t.limit * f.value(t.drive * (row.b + x), t.sharpness);
      };
      const std::vector<double> h = sine_harmonics(curve, row.a, 7);
      for (std::size_t n = 0; n < row.h.size(); ++n) {
        CAPTURE(t.family);
        CAPTURE(row.b);
        CAPTURE(row.a);
        CAPTURE(n);
        // Tables have 14 digits of numbers up to 1.6; sums of 512 doubles add some 1e-15.
        CHECK(std::abs(h[n] - row.h[n]) < 1e-12);
      }
    }
  }
}

TEST_CASE("evaluate gives a curve through the origin with gain limit * drive * S'(bias)") {
  for (const SigmoidFamily& f : sigmoid_families()) {
    const SigmoidParameters p{1.7, 2.3, -0.4, f.has_sharpness ? 3.0 : 1.0};
    CHECK(evaluate(f, p, 0.0) == 0.0);
    const double gain = (evaluate(f, p, 1e-6) - evaluate(f, p, -1e-6)) / 2e-6;
    CHECK(gain == doctest::Approx(1.7 * 2.3 * f.slope(-0.4, p.sharpness)).epsilon(1e-9));
    const double rest = f.value(-0.4, p.sharpness);
    CHECK(evaluate(f, p, 1e12) == doctest::Approx(1.7 * (1.0 - rest)).epsilon(1e-9));
    CHECK(evaluate(f, p, -1e12) == doctest::Approx(1.7 * (-1.0 - rest)).epsilon(1e-9));
  }
}
