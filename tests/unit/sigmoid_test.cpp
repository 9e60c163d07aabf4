// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/sigmoid.h"

#include <doctest/doctest.h>

#include <cmath>
#include <initializer_list>
#include <numbers>

#include "quantity/failure.h"
#include "unit/harmonics.h"

using kneeprint::Hertz;
using kneeprint::sigmoid_shape;
using kneeprint::SigmoidShape;
using kneeprint::SigmoidUnit;

namespace {

double through(SigmoidUnit& unit, double volts) {
  unit.process({&volts, 1});
  return volts;
}

}  // namespace

TEST_CASE("a unit's static curve has the reference harmonics") {
  // Reference values 1.8 to 1.10 (tanh x, atan x, x/sqrt(1+x^2)), 14 digits, rows b, A. The unit's
  // atan has the slope 1 at 0 and the limit 1: (2/pi) atan(pi x/2), undone by its settings.
  struct Row {
    SigmoidShape shape;
    double bias, amplitude;
    double h[8];
  };
  const Row rows[] = {
      {SigmoidShape::tanh,
       0,
       1,
       {0, 0.81167568513156, 0, -0.054245810326264, 0, 4.5168219928309e-3, 0, -3.8244717057282e-4}},
      {SigmoidShape::tanh,
       0.2,
       0.5,
       {0.17618025871897, 0.45569006564865, -0.020399662838296, -8.0057713612405e-3,
        7.7051018118973e-4, 1.5872731494323e-4, -2.4188281130908e-5, -2.8693391652923e-6}},
      {SigmoidShape::tanh,
       0.5,
       5,
       {0.064993675712911, 1.2446099554482, -0.11984025586216, -0.34832321735665, 0.096046866508829,
        0.15076608220762, -0.069135316176213, -0.068214214858667}},
      {SigmoidShape::atan,
       0,
       2,
       {0, 1.2360679774998, 0, -0.15737865166653, 0, 0.03606797749979, 0, -9.8405296424666e-3}},
      {SigmoidShape::atan,
       0.2,
       1,
       {0.14118108251913, 0.81439157190608, -0.047131581760848, -0.042283326739345,
        7.6569534858013e-3, 3.5825171799607e-3, -1.2090424856438e-3, -3.1291373546133e-4}},
      {SigmoidShape::algebraic,
       0.2,
       1,
       {0.12148990502803, 0.74618301134739, -0.059907655471192, -0.054824051846617,
        0.012062879791139, 5.6083326710828e-3, -2.2066246800971e-3, -5.4865299082749e-4}},
      {SigmoidShape::algebraic,
       0.5,
       2,
       {0.16905643839997, 0.99348719158574, -0.17247574100543, -0.130996510026, 0.070620172085842,
        0.018467018161994, -0.025084336705259, 6.216606954651e-4}},
  };
  for (const Row& row : rows) {
    const double scale = row.shape == SigmoidShape::atan ? std::numbers::pi / 2.0 : 1.0;
    SigmoidUnit unit({row.shape, scale, 1.0 / scale, row.bias / scale, 2.0});
    const double rest = scale * sigmoid_shape(row.shape, 2.0, row.bias / scale);
    for (std::size_t n = 0; n < 8; ++n) {
      CAPTURE(row.bias);
      CAPTURE(n);
      const double h =
          harmonic([&](double v) { return through(unit, v); }, 0.0, row.amplitude, n, 4096);
      // 1e-12 is the sheet's tolerance, and the table's own error bound.
      CHECK(std::fabs(h + (n == 0 ? rest : 0.0) - row.h[n]) < 2e-12);
    }
  }
}

TEST_CASE("every shape has slope 1 at 0, limit 1, and odd symmetry") {
  for (const auto shape :
       {SigmoidShape::tanh, SigmoidShape::atan, SigmoidShape::algebraic, SigmoidShape::erf}) {
    for (const double p : {1.0, 2.0, 3.5, 20.0}) {
      CHECK(sigmoid_shape(shape, p, 1e-7) == doctest::Approx(1e-7).epsilon(1e-6));
      CHECK(sigmoid_shape(shape, p, 1e9) == doctest::Approx(1.0).epsilon(1e-8));
      CHECK(sigmoid_shape(shape, p, -0.7) == -sigmoid_shape(shape, p, 0.7));
      CHECK(sigmoid_shape(shape, p, 0.9999999) ==
            doctest::Approx(sigmoid_shape(shape, p, 1.0000001)).epsilon(1e-6));
    }
  }
  CHECK(sigmoid_shape(SigmoidShape::algebraic, 4.0, 3.0) ==
        doctest::Approx(3.0 / std::pow(82.0, 0.25)).epsilon(1e-14));
  CHECK(sigmoid_shape(SigmoidShape::algebraic, 2.0, 3.0) ==
        doctest::Approx(3.0 / std::sqrt(10.0)).epsilon(1e-14));
  CHECK(sigmoid_shape(SigmoidShape::erf, 2.0, 1.0) ==
        doctest::Approx(std::erf(std::sqrt(std::numbers::pi) / 2)).epsilon(1e-14));
}

TEST_CASE("the tabulated unit is its formula over the whole range") {
  for (const auto shape : {SigmoidShape::tanh, SigmoidShape::atan, SigmoidShape::erf}) {
    SigmoidUnit unit({shape, 4.0, 1.7, 0.15, 2.0});
    double worst = 0.0;
    for (double v = -25.0; v <= 25.0; v += 0.00731) {
      const double exact =
          4.0 * (sigmoid_shape(shape, 2.0, 1.7 * v + 0.15) - sigmoid_shape(shape, 2.0, 0.15));
      worst = std::fmax(worst, std::fabs(through(unit, v) - exact));
    }
    CHECK(worst < 4e-12);  // limit 4 V times the table's 1e-12
  }
}

TEST_CASE("settings: defaults, families, refusals that name the setting") {
  const auto make = [](const kneeprint::UnitSettings& s) {
    return kneeprint::kSigmoidUnit.make(s, Hertz(3072000.0));
  };
  double v = 1.0;
  make({})->process({&v, 1});
  CHECK(v == doctest::Approx(4.0 * (std::tanh(0.55) - std::tanh(0.15))).epsilon(1e-12));
  v = 1.0;
  make({{"family", "algebraic"}, {"limit", "2"}, {"drive", "1"}, {"bias", "0"}, {"sharpness", "4"}})
      ->process({&v, 1});
  CHECK(v == doctest::Approx(2.0 / std::pow(2.0, 0.25)).epsilon(1e-12));
  CHECK_THROWS_WITH_AS(make({{"family", "square"}}),
                       "virtual unit sigmoid: setting family=square must be one of tanh, atan, "
                       "algebraic, erf",
                       kneeprint::UsageError);
  CHECK_THROWS_AS(make({{"limit", "-1"}}), kneeprint::UsageError);
  CHECK_THROWS_AS(make({{"drive", "0.4V"}}), kneeprint::UsageError);
  CHECK_THROWS_AS(make({{"bias", "nan"}}), kneeprint::UsageError);
  CHECK_THROWS_AS(make({{"limits", "1"}}), kneeprint::UsageError);
}
