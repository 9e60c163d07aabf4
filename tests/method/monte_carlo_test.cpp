// SPDX-License-Identifier: GPL-3.0-or-later
// Propagated uncertainties of ratios and sums against the propagation of distributions (JCGM
// 101:2008): inputs drawn from what is stated of them, the figure computed from its definition.
#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <complex>
#include <functional>
#include <vector>

#include "method/acceptance.h"
#include "method/reading.h"
#include "method/repeats.h"

using namespace kneeprint;
using namespace kneeprint::testing;

namespace {

struct Propagated {
  double mean = 0.0, u = 0.0, low = 0.0, high = 0.0;  ///< ends of the middle 95 %
};

Propagated propagate(const std::function<double(Random&)>& draw) {
  constexpr int kTrials = 200000;
  Random random(51);
  std::vector<double> values(kTrials);
  Propagated out;
  for (double& v : values) {
    v = draw(random);
    out.mean += v / kTrials;
  }
  for (const double v : values) out.u += (v - out.mean) * (v - out.mean) / (kTrials - 1.0);
  out.u = std::sqrt(out.u);
  std::sort(values.begin(), values.end());
  out.low = values[kTrials / 40];
  out.high = values[kTrials - kTrials / 40];
  return out;
}

// 2 10^5 trials know a standard deviation to 0.16 % and an end of the interval to 0.6 % of u (one
// standard deviation each); linear propagation errs by terms of (u / value)^2.
void agree(const std::string& what, const Propagated& seen, const RelativeReading& stated) {
  CAPTURE(what);
  const double expanded = coverage_factor_95(stated.dof) * stated.u;
  report(
      fmt::format("propagation {:28} stated u {:.6f}, Monte Carlo {:.6f}; interval {:.6f} .. "
                  "{:.6f}, Monte Carlo {:.6f} .. {:.6f}",
                  what, stated.u, seen.u, stated.ratio - expanded, stated.ratio + expanded,
                  seen.low, seen.high));
  CHECK(stated.u == doctest::Approx(seen.u).epsilon(0.015));
  CHECK(std::abs(stated.ratio - expanded - seen.low) < 0.05 * stated.u);
  CHECK(std::abs(stated.ratio + expanded - seen.high) < 0.05 * stated.u);
}

std::complex<double> around(std::complex<double> mean, double u, Random& random) {
  return mean + std::complex<double>(u * gaussian(random), u * gaussian(random));
}

}  // namespace

TEST_CASE("THD of the published example: 1, 0.5, 0.1 %, 0.02 % each") {
  // D = 1.122497216 %, u = 0.02 % exactly (algebra: sqrt(sum (r u)^2) / D with one u for all).
  const Line reference{1.0, 0.0, kInfiniteDof};
  std::vector<RelativeReading> orders;
  for (const double r : {0.01, 0.005, 0.001}) {
    orders.push_back(relate(std::hypot(r, 2e-4), 2e-4, kInfiniteDof, reference, 0.0));
  }
  const RelativeReading d = root_sum_of(orders);
  CHECK(100.0 * d.ratio == doctest::Approx(1.122497216).epsilon(1e-9));
  CHECK(100.0 * d.u == doctest::Approx(0.02).epsilon(1e-9));
}

TEST_CASE("THD against Monte Carlo: noise, a rig floor, a shared fundamental, a shared split") {
  struct Case {
    std::string what;
    std::vector<double> ratios;
    double u, floor, split;
  };
  // At 100 % THD the shared fundamental is half of the variance: taken for independent it would be
  // an eighth.
  for (const Case& c : {Case{"weak", {0.01, 0.005, 0.003}, 1e-4, 0.0, 0.0},
                        Case{"with a floor", {0.01, 0.005, 0.003}, 1e-4, 1e-4, 0.0},
                        Case{"as strong as the fundamental", {0.5, 0.5, 0.5, 0.5}, 0.01, 0.0, 0.0},
                        Case{"with an unknown split", {0.05, 0.05, 0.05}, 2e-4, 0.0, 0.02}}) {
    const Line reference{1.0, c.u, kInfiniteDof};
    std::vector<RelativeReading> orders;
    for (const double r : c.ratios) {
      // The reading whose noise-free value is r.
      const RelativeReading one = relate(std::hypot(r, c.u), c.u, kInfiniteDof, reference, c.floor);
      orders.push_back(with_common(one, c.split));
    }
    const Propagated seen = propagate([&](Random& random) {
      const double fundamental = std::abs(around(1.0, c.u, random));
      // One split for all: rectangular, of standard deviation `split`.
      const double split = 1.0 + c.split * std::sqrt(3.0) *
                                     std::uniform_real_distribution<double>(-1.0, 1.0)(random);
      double squares = 0.0;
      for (const double r : c.ratios) {
        const auto h = around(r, c.u, random) + std::polar(c.floor, any_phase(random));
        squares += std::norm(h * split / fundamental) - 2.0 * c.u * c.u;
      }
      return std::sqrt(squares);
    });
    if (c.split == 0.0) {
      agree("THD " + c.what, seen, root_sum_of(orders));
    } else {
      // A ruling rectangular term has 95 % within 1.65 u: only the u of both can agree.
      CHECK(root_sum_of(orders).u == doctest::Approx(seen.u).epsilon(0.015));
      CHECK(root_sum_of(orders).ratio + 1.96 * root_sum_of(orders).u >= seen.high);
    }
  }
}

TEST_CASE("m2, m3, d2, d3 against Monte Carlo") {
  // Stated by readings of takes in white noise, against draws of the lines themselves around their
  // closed forms. A reading knows its noise to 5 %, the mean of forty to 1 %.
  constexpr int kTakes = 40;
  const double c2 = 0.05, c3 = 0.06, v = 4e-4;
  for (const std::string method : {"smpte", "ccif"}) {
    const bool smpte = method == "smpte";
    const TwoToneRepeats repeats(method, NoiseKind::white, v, {c2, c3}, {0.0, 0.0, -160.0});
    std::map<std::string, double> u;
    Random random(52);
    for (int t = 0; t < kTakes; ++t) {
      for (const Stated& s : repeats.once(random)) {
        // Some 190 degrees of freedom: k = 1.97.
        u[s.name] += (s.high - s.low) / 2.0 / 1.97 / kTakes;
      }
    }
    const double u1 = smpte ? 0.8 : 0.5, u2 = smpte ? 0.2 : 0.5;
    const double tone1 = u1 + c3 * (0.75 * u1 * u1 * u1 + 1.5 * u1 * u2 * u2);
    const double tone2 = u2 + c3 * (0.75 * u2 * u2 * u2 + 1.5 * u2 * u1 * u1);
    const auto line = [&](double peak, Random& r) { return std::abs(around(peak, v, r)); };
    const auto reference = [&](Random& r) {
      return smpte ? line(tone2, r) : line(tone1, r) + line(tone2, r);
    };
    for (const auto& [figure, stated] : u) {
      CAPTURE(figure);
      const bool second = figure[1] == '2';
      const double lower = second ? c2 * u1 * u2 : 0.75 * c3 * u1 * u1 * u2;
      const double upper = smpte || second ? lower : 0.75 * c3 * u2 * u2 * u1;
      const bool single = figure == "d2";
      const Propagated seen = propagate([&, single](Random& r) {
        return (line(lower, r) + (single ? 0.0 : line(upper, r))) / reference(r);
      });
      report(fmt::format("propagation {:28} stated u {:.6f}, Monte Carlo {:.6f}", figure, stated,
                         seen.u));
      CHECK(stated == doctest::Approx(seen.u).epsilon(0.04));
    }
  }
}
