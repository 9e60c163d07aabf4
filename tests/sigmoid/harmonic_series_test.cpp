// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/harmonic_series.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>

#include "sigmoid/predict.h"
#include "sigmoid/reference_harmonics.h"

using namespace kneeprint;
using namespace kneeprint::testing;

namespace {

struct Case {
  const char* family;
  double swing, bias, sharpness;
};

// The centre crossed or not, gently or steeply, smooth or with a corner.
constexpr Case kCases[] = {
    {"tanh", 0.01, 0.0, 1},      {"tanh", 2.0, -0.3, 1},       {"tanh", 60.0, 0.4, 1},
    {"atan", 0.3, 0.7, 1},       {"atan", 40.0, 0.4, 1},       {"erf", 1.5, 0.5, 1},
    {"erf", 25.0, -1.0, 1},      {"algebraic", 0.02, 0.0, 1},  {"algebraic", 3.0, 0.2, 1},
    {"algebraic", 0.5, 0.52, 1}, {"algebraic", 8.0, 0.1, 1.3}, {"algebraic", 2.0, 0.3, 2.7},
    {"algebraic", 1.02, 0, 40},  {"algebraic", 30.0, 0.5, 40}, {"algebraic", 0.4, 1.1, 9},
};

SigmoidParameters parameters(const Case& c, double amplitude) {
  return {1.0, c.swing / amplitude, c.bias, c.sharpness};
}

}  // namespace

TEST_CASE("the adaptive series agrees with the reference tables") {
  HarmonicSeries series(7);
  HarmonicSet set;
  for (const ReferenceTable& t : kReferenceTables) {
    const SigmoidFamily& f = *find_family(t.family);
    for (const ReferenceHarmonics& row : t.rows) {
      const SigmoidParameters p{1.0, t.drive, t.drive * row.b, t.sharpness};
      series.evaluate(f, p, row.a, 1e-12, false, set);
      for (std::size_t n = 0; n < row.h.size(); ++n) {
        const double rest = n == 0 ? t.limit * f.value(p.bias, p.sharpness) : 0.0;
        CHECK(std::abs(t.limit * set.value[n] + rest - row.h[n]) < 2e-12);
      }
    }
  }
}

TEST_CASE("the adaptive series agrees with a fixed rule of 65536 points") {
  HarmonicSeries series(10);
  HarmonicSet set;
  for (const Case& c : kCases) {
    CAPTURE(c.family);
    CAPTURE(c.swing);
    CAPTURE(c.bias);
    CAPTURE(c.sharpness);
    const SigmoidFamily& f = *find_family(c.family);
    const SigmoidParameters p = parameters(c, 0.37);
    series.evaluate(f, p, 0.37, 1e-12, false, set);
    const auto fixed =
        sine_harmonics([&](double x) { return evaluate(f, p, x); }, 0.37, 10, 1 << 16);
    for (std::size_t n = 0; n <= 10; ++n) {
      CAPTURE(n);
      // The fixed rule's own error: 4e-14 at the sharpest corner here, its rounding below 1e-12.
      CHECK(std::abs(set.value[n] - fixed[n]) < 1e-12);
    }
  }
}

TEST_CASE("derivatives by drive, bias and sharpness, against central differences") {
  constexpr double kStep = 1e-5;
  HarmonicSeries series(10);
  HarmonicSet set, above, below;
  for (const Case& c : kCases) {
    CAPTURE(c.family);
    CAPTURE(c.swing);
    CAPTURE(c.bias);
    CAPTURE(c.sharpness);
    const SigmoidFamily& f = *find_family(c.family);
    const SigmoidParameters p = parameters(c, 0.37);
    series.evaluate(f, p, 0.37, 1e-12, true, set);
    const auto check = [&](double SigmoidParameters::*which, const std::vector<double>& found) {
      SigmoidParameters up = p, down = p;
      const double step = kStep * std::max(p.*which, 0.1);
      up.*which += step;
      down.*which -= step;
      series.evaluate(f, up, 0.37, 1e-13, false, above);
      series.evaluate(f, down, 0.37, 1e-13, false, below);
      double size = 0.0;
      for (const double d : found) size = std::max(size, std::abs(d));
      for (std::size_t n = 0; n <= 10; ++n) {
        CAPTURE(n);
        const double slope = (above.value[n] - below.value[n]) / (2.0 * step);
        // Differences: 1e-12 / step from the quadrature, and the relative step squared.
        CHECK(std::abs(found[n] - slope) < 1e-12 / step + 1e-6 * size);
      }
    };
    check(&SigmoidParameters::drive, set.by_drive);
    check(&SigmoidParameters::bias, set.by_bias);
    if (f.has_sharpness && c.sharpness > 1.0) {
      check(&SigmoidParameters::sharpness, set.by_sharpness);
    }
  }
}
