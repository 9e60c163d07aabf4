// SPDX-License-Identifier: GPL-3.0-or-later
// Are the standard errors right? Sixty noises for each family, judged by bounds that a right answer
// passes with 99.9 % for all figures together.
#include "sigmoid/fit_family.h"

#include <doctest/doctest.h>

#include <array>
#include <boost/math/distributions/binomial.hpp>
#include <boost/math/distributions/chi_squared.hpp>
#include <cmath>

#include "sigmoid/predict.h"
#include "sigmoid/synthetic_harmonics.h"

using namespace kneeprint;
using namespace kneeprint::testing;

namespace {

constexpr int kRepeats = 60;
constexpr int kFigures = 2 * (3 * 3 + 2 * 4);  // coverage and size, parameters of five curves
constexpr double kRisk = 0.001 / kFigures;

struct Tally {
  int inside = 0;
  double squares = 0.0;

  void add(const FittedParameter& found, double truth) {
    inside += found.low95 <= truth && truth <= found.high95;
    squares += std::pow((found.value - truth) / found.standard_error, 2);
  }

  void check() const {
    const boost::math::binomial_distribution<> hits(kRepeats, 0.95);
    CHECK(boost::math::cdf(hits, inside) > kRisk);
    const boost::math::chi_squared_distribution<> spread(kRepeats);
    CHECK(squares > boost::math::quantile(spread, 0.5 * kRisk));
    CHECK(squares < boost::math::quantile(boost::math::complement(spread, 0.5 * kRisk)));
  }
};

// Coarse enough a measurement that errors are not lost in rounding, fine enough to be linear.
void check_coverage(const char* id, const SigmoidParameters& truth) {
  Ladder ladder;
  ladder.drives = 12;
  ladder.lowest_u_db = -110.0;
  ladder.highest_u_db = -90.0;
  const SigmoidFamily& family = *find_family(id);
  std::array<Tally, 4> tallies;
  for (int seed = 0; seed < kRepeats; ++seed) {
    const std::vector<FitDatum> data =
        measured(family, truth, 1000 + static_cast<std::uint64_t>(seed), ladder);
    const FittedFamily f = fit_family(family, HarmonicData(data), {});
    REQUIRE(f.converged);
    tallies[0].add(f.limit, truth.limit);
    tallies[1].add(f.drive, truth.drive);
    tallies[2].add(f.bias, truth.bias);
    REQUIRE(f.sharpness.has_value() == family.has_sharpness);
    if (f.sharpness) tallies[3].add(*f.sharpness, truth.sharpness);
  }
  for (std::size_t i = 0; i < (family.has_sharpness ? 4u : 3u); ++i) {
    CAPTURE(i);
    tallies[i].check();
  }
}

}  // namespace

TEST_CASE("coverage of the intervals: tanh") { check_coverage("tanh", {1.3, 2.0, 0.2, 1.0}); }
TEST_CASE("coverage of the intervals: atan") { check_coverage("atan", {0.9, 3.0, -0.35, 1.0}); }
TEST_CASE("coverage of the intervals: erf") { check_coverage("erf", {1.2, 2.0, 0.5, 1.0}); }
TEST_CASE("coverage of the intervals: algebraic, p = 2") {
  check_coverage("algebraic", {1.1, 2.5, 0.1, 2.0});
}
TEST_CASE("coverage of the intervals: algebraic, p = 6") {
  check_coverage("algebraic", {1.0, 1.5, 0.15, 6.0});
}

TEST_CASE("doubt about the scales of input and output enters drive and limit in quadrature") {
  const SigmoidFamily& family = *find_family("tanh");
  const HarmonicData data(measured(family, {1.3, 2.0, 0.2, 1.0}, 1));
  const FittedFamily without = fit_family(family, data, {});
  const FittedFamily with = fit_family(family, data, {0.003, 0.004});
  const auto relative = [](const FittedParameter& p) { return p.standard_error / p.value; };
  CHECK(relative(with.drive) == doctest::Approx(std::hypot(relative(without.drive), 0.003)));
  CHECK(relative(with.limit) == doctest::Approx(std::hypot(relative(without.limit), 0.004)));
  CHECK(with.bias.standard_error == without.bias.standard_error);
  // ln-normal interval: 1.959964 standard deviations either way.
  CHECK(std::log(with.limit.high95 / with.limit.value) ==
        doctest::Approx(1.959964 * relative(with.limit)).epsilon(1e-6));
  CHECK(std::log(with.limit.value / with.limit.low95) ==
        doctest::Approx(1.959964 * relative(with.limit)).epsilon(1e-6));
}

TEST_CASE("the discrepancy of a wrong family is the likeliest share of the distortion") {
  const SigmoidFamily& truth = *find_family("algebraic");
  const std::vector<FitDatum> data = measured(truth, {1.1, 2.5, 0.1, 2.0}, 11);
  const HarmonicData harmonics(data);
  for (const char* id : {"tanh", "atan", "erf"}) {
    CAPTURE(id);
    const SigmoidFamily& family = *find_family(id);
    const FittedFamily f = fit_family(family, harmonics, {});
    CHECK(f.parameters == 4);
    CHECK(f.converged);
    const auto curve = [&](double x) { return evaluate(family, f.point(), x); };
    double chi_square = 0.0;
    const auto minus_2_ln_l = [&](double discrepancy) {
      double sum = 0.0;
      chi_square = 0.0;
      for (const HarmonicData::Rung& rung : harmonics.rungs()) {
        const std::vector<double> h = sine_harmonics(curve, rung.input_peak, 10, 4096);
        double distortion = 0.0;
        for (const FitDatum& d : rung.data) {
          if (d.order > 1) distortion = std::hypot(distortion, d.value);
        }
        for (const FitDatum& d : rung.data) {
          const double r = h[static_cast<std::size_t>(d.order)] - d.value;
          const double variance = d.u * d.u + std::pow(discrepancy * distortion, 2);
          chi_square += std::pow(r / d.u, 2);
          sum += r * r / variance + std::log(variance);
        }
      }
      return sum;
    };
    CHECK(f.discrepancy > 0.0);
    // Brent stops within 0.1 % of two decades: under 1 % of d.
    const double minus_2_log_likelihood = minus_2_ln_l(f.discrepancy);
    CHECK(minus_2_log_likelihood < minus_2_ln_l(0.97 * f.discrepancy));
    CHECK(minus_2_log_likelihood < minus_2_ln_l(1.03 * f.discrepancy));
    CHECK(f.chi_square == doctest::Approx(chi_square).epsilon(1e-6));
    const double k = f.parameters, n = f.data;
    CHECK(f.aicc == doctest::Approx(minus_2_log_likelihood + 2 * k + 2 * k * (k + 1) / (n - k - 1))
                        .epsilon(1e-9));
  }
}

TEST_CASE("a family that reaches the data has no discrepancy") {
  const SigmoidFamily& family = *find_family("erf");
  const FittedFamily f = fit_family(family, HarmonicData(measured(family, {1, 2, 0.1, 1}, 4)), {});
  CHECK(f.discrepancy == 0.0);
  CHECK(f.parameters == 3);
}

TEST_CASE("what every drive has in common widens the intervals, and does not average out") {
  using namespace kneeprint;
  const SigmoidFamily& family = *find_family("tanh");
  const SigmoidParameters truth{4.0, 0.4, 0.15, 1.0};
  const auto curve = [&](double x) { return evaluate(family, truth, x); };
  // The rig adds its own second harmonic, 1e-6 of the fundamental, at every drive. The fundamental
  // is known ten times less well, so that the bias hangs on the even orders.
  constexpr double kFloor = 1e-6, kFundamental = 1e-5;
  const auto fitted = [&](bool in_common) {
    std::vector<FitDatum> data;
    for (double amplitude = 0.1; amplitude < 8.0; amplitude *= 1.4) {
      const std::vector<double> h = sine_harmonics(curve, amplitude, 6);
      const double h1 = std::abs(h[1]);
      for (int n = 1; n <= 6; ++n) {
        const double floor = n > 1 ? kFloor * h1 : 0.0;
        FitDatum d{amplitude,
                   n,
                   h[static_cast<std::size_t>(n)],
                   n > 1 ? floor : kFundamental * h1,
                   true,
                   in_common ? floor : 0.0};
        if (n == 2) d.value += floor;
        data.push_back(d);
      }
    }
    return fit_family(family, HarmonicData(data), {});
  };
  const FittedFamily told = fitted(true), averaged = fitted(false);
  CHECK(std::abs(told.bias.value - truth.bias) < 2.0 * told.bias.standard_error);
  CHECK(told.bias.standard_error > 1.5 * averaged.bias.standard_error);
}
