// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/fit.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <boost/math/distributions/chi_squared.hpp>
#include <cmath>
#include <limits>
#include <string>

#include "quantity/failure.h"
#include "sigmoid/reference_harmonics.h"
#include "sigmoid/synthetic_harmonics.h"

using namespace kneeprint;
using namespace kneeprint::testing;

namespace {

struct Truth {
  const char* family;
  SigmoidParameters p;
};

constexpr Truth kTruths[] = {
    {"tanh", {1.3, 2.0, 0.2, 1.0}},        {"atan", {0.9, 3.0, -0.35, 1.0}},
    {"algebraic", {1.1, 2.5, 0.1, 2.0}},   {"algebraic", {1.0, 1.5, -0.15, 6.0}},
    {"erf", {1.2, 2.0, 0.5, 1.0}},         {"algebraic", {1.0, 3.0, 0.1, 1.0}},
    {"algebraic", {1.0, 1.5, 0.02, 40.0}},
};

bool inside(const FittedParameter& p, double truth) {
  return p.low95 <= truth && truth <= p.high95;
}

bool chi_square_is_fair(const FittedFamily& f) {
  const boost::math::chi_squared_distribution<> fair(f.data - f.parameters);
  return f.chi_square > boost::math::quantile(fair, 0.0005) &&
         f.chi_square < boost::math::quantile(boost::math::complement(fair, 0.0005));
}

const FittedFamily& best_of(const FitResult& r) { return r.families[r.best]; }

std::string refusal(const std::vector<FitDatum>& data) {
  try {
    fit_sigmoids(data, {});
  } catch (const InputError& e) {
    return e.what();
  }
  return "";
}

}  // namespace

TEST_CASE("a known curve comes back: family, limit, drive, bias, sharpness") {
  for (const Truth& t : kTruths) {
    CAPTURE(t.family);
    CAPTURE(t.p.sharpness);
    const FitResult r = fit_sigmoids(measured(*find_family(t.family), t.p, 21), {});
    const FittedFamily& f = best_of(r);
    CHECK(f.family->id == t.family);
    CHECK(f.converged);
    CHECK(f.discrepancy == 0.0);
    CHECK(std::abs(f.limit.value / t.p.limit - 1.0) < 0.005);
    CHECK(std::abs(f.drive.value / t.p.drive - 1.0) < 0.005);
    CHECK(std::abs(f.bias.value - t.p.bias) < 0.005);
    CHECK(inside(f.limit, t.p.limit));
    CHECK(inside(f.drive, t.p.drive));
    CHECK(inside(f.bias, t.p.bias));
    if (f.sharpness) CHECK(inside(*f.sharpness, t.p.sharpness));
    CHECK(chi_square_is_fair(f));
    CHECK(f.extrapolated == (f.reach < 0.8));
    CHECK(r.equally_good == std::vector<std::size_t>{r.best});
    for (const FittedFamily& other : r.families) {
      CHECK(other.aicc >= f.aicc);
      CHECK((other.family == f.family) == (other.discrepancy == 0.0));
    }
  }
}

TEST_CASE("families come in registry order") {
  const FitResult r = fit_sigmoids(measured(*find_family("tanh"), kTruths[0].p, 2), {});
  REQUIRE(r.families.size() == sigmoid_families().size());
  for (std::size_t i = 0; i < r.families.size(); ++i) {
    CHECK(r.families[i].family == &sigmoid_families()[i]);
    CHECK(r.families[i].data == 200);
  }
}

TEST_CASE("the reference tables, H0 to H7, give back their bias with its sign") {
  for (const ReferenceTable& t : kReferenceTables) {
    for (const double b : {0.2, 0.5}) {
      for (const double sign : {1.0, -1.0}) {
        CAPTURE(t.family);
        CAPTURE(sign * b);
        const SigmoidFamily& family = *find_family(t.family);
        const double rest = t.limit * family.value(t.drive * b, t.sharpness);
        std::vector<FitDatum> data;
        for (const ReferenceHarmonics& row : t.rows) {
          if (row.b != b) continue;
          for (int n = 0; n < 8; ++n) {
            // The curve passes through the origin. H_n(-b) = (-1)^(n+1) H_n(b) for an odd S.
            const double h = row.h[static_cast<std::size_t>(n)] - (n == 0 ? rest : 0.0);
            data.push_back({row.a, n, n % 2 == 0 ? sign * h : h, 1e-10, true});
          }
        }
        const FitResult r = fit_sigmoids(data, {});
        const FittedFamily& f = best_of(r);
        CHECK(f.family->id == t.family);
        CHECK(f.limit.value == doctest::Approx(t.limit).epsilon(1e-9));
        CHECK(f.drive.value == doctest::Approx(t.drive).epsilon(1e-9));
        CHECK(f.bias.value == doctest::Approx(sign * t.drive * b).epsilon(1e-9));
        if (f.sharpness) CHECK(f.sharpness->value == doctest::Approx(2.0).epsilon(1e-8));
      }
    }
  }
}

TEST_CASE("noise of 1e-9 finds no error of the quadrature") {
  Ladder ladder;
  ladder.lowest_u_db = ladder.highest_u_db = -180.0;
  ladder.highest_db = 12.0;
  // The worst corner that the sixteen thousand points of the synthetic data resolve to 1e-10.
  const Truth hard[] = {{"tanh", {1.0, 5.0, 0.3, 1.0}},
                        {"atan", {1.0, 4.0, -0.1, 1.0}},
                        {"erf", {1.0, 3.0, 0.7, 1.0}},
                        {"algebraic", {1.0, 2.0, 0.2, 1.6}},
                        {"algebraic", {1.0, 1.0, 0.05, 20.0}}};
  for (const Truth& t : hard) {
    CAPTURE(t.family);
    CAPTURE(t.p.sharpness);
    const FitResult r = fit_sigmoids(measured(*find_family(t.family), t.p, 8, ladder), {});
    const FittedFamily& f = best_of(r);
    CHECK(f.family->id == t.family);
    CHECK(f.discrepancy == 0.0);
    CHECK(chi_square_is_fair(f));
    CHECK(std::abs(f.bias.value - t.p.bias) < 5.0 * f.bias.standard_error);
  }
}

TEST_CASE("large bias of either sign") {
  for (const double bias : {-1.4, -0.8, 0.8, 1.4}) {
    for (const char* id : {"tanh", "atan", "erf"}) {
      CAPTURE(bias);
      CAPTURE(id);
      const SigmoidParameters p{1.0, 2.0, bias, 1.0};
      const FitResult r = fit_sigmoids(measured(*find_family(id), p, 31), {});
      CHECK(best_of(r).family->id == id);
      CHECK(best_of(r).bias.value == doctest::Approx(bias).epsilon(1e-3));
    }
  }
}

TEST_CASE("magnitudes alone give limit, drive and the size of the bias") {
  const SigmoidParameters p{1.3, 2.0, -0.3, 1.0};
  std::vector<FitDatum> data = measured(*find_family("tanh"), p, 6);
  for (FitDatum& d : data) {
    d.has_sign = false;
    d.value = std::abs(d.value);
  }
  // Magnitudes under the noise are biased: they stay out, as they do in a measurement.
  std::erase_if(data, [](const FitDatum& d) { return d.value < 10.0 * d.u; });
  const FittedFamily f = best_of(fit_sigmoids(data, {}));
  CHECK(f.family->id == "tanh");
  CHECK(f.limit.value == doctest::Approx(p.limit).epsilon(1e-3));
  CHECK(f.drive.value == doctest::Approx(p.drive).epsilon(1e-3));
  CHECK(std::abs(f.bias.value) == doctest::Approx(0.3).epsilon(1e-3));
}

TEST_CASE("a limit never approached is called extrapolated, and the families disagree on it") {
  Ladder ladder;
  ladder.lowest_u_db = -105.0;
  ladder.highest_u_db = -85.0;
  const SigmoidParameters p{1.0, 0.3, 0.2, 1.0};
  const FitResult r = fit_sigmoids(measured(*find_family("tanh"), p, 9, ladder), {});
  const FittedFamily& f = r.families[0];
  CHECK(f.extrapolated);
  // Half the swing of tanh(0.2 +- 0.3).
  CHECK(f.reach == doctest::Approx(0.5 * (std::tanh(0.5) + std::tanh(0.1))).epsilon(0.02));
  CHECK(r.equally_good.size() > 1);
  CHECK(std::find(r.equally_good.begin(), r.equally_good.end(), r.best) != r.equally_good.end());
  CHECK(r.limit_low < 1.0);
  CHECK(r.limit_high > 1.0);
  for (const std::size_t i : r.equally_good) {
    CHECK(r.limit_low <= r.families[i].limit.value);
    CHECK(r.limit_high >= r.families[i].limit.value);
  }
}

TEST_CASE("a limit that was approached is not extrapolated") {
  const FittedFamily f = best_of(fit_sigmoids(measured(*find_family("erf"), kTruths[4].p, 9), {}));
  CHECK(!f.extrapolated);
  CHECK(f.reach == doctest::Approx(0.969).epsilon(0.001));  // half of S(2.5) - S(-1.5)
}

TEST_CASE("a plain wire yields no nonsense: all figures finite, the limit extrapolated") {
  Gaussian noise(3);
  std::vector<FitDatum> data;
  for (int i = 0; i < 10; ++i) {
    const double input = from_db(-3.0 * i);
    for (int n = 1; n <= 5; ++n) {
      data.push_back({input, n, (n == 1 ? input : 0.0) + 1e-6 * noise(), 1e-6, true});
    }
  }
  const FitResult r = fit_sigmoids(data, {});
  for (const FittedFamily& f : r.families) {
    CAPTURE(f.family->id);
    CHECK(f.extrapolated);
    for (const FittedParameter& p : {f.limit, f.drive, f.bias}) {
      for (const double x : {p.value, p.standard_error, p.low95, p.high95}) CHECK(std::isfinite(x));
    }
    CHECK(std::isfinite(f.aicc));
    const double gain =
        f.limit.value * f.drive.value * f.family->slope(f.bias.value, f.point().sharpness);
    CHECK(gain == doctest::Approx(1.0).epsilon(1e-4));
  }
}

TEST_CASE("too little to fit, or nothing that rises, is said") {
  const std::vector<FitDatum> all = measured(*find_family("tanh"), kTruths[0].p, 1);
  CHECK_THROWS_AS(fit_sigmoids({}, {}), NothingUsable);
  CHECK_THROWS_AS(fit_sigmoids({all.begin(), all.begin() + 7}, {}), NothingUsable);
  CHECK_THROWS_AS(fit_sigmoids({all.begin(), all.begin() + 20}, {}), NothingUsable);  // two drives
  std::vector<FitDatum> silent = all, inverted = all;
  for (FitDatum& d : silent) d.value = 0.0;
  for (FitDatum& d : inverted) d.value = -d.value;
  CHECK_THROWS_AS(fit_sigmoids(silent, {}), NothingUsable);
  CHECK_THROWS_AS(fit_sigmoids(inverted, {}), NothingUsable);
}

TEST_CASE("data out of range are named") {
  const std::vector<FitDatum> all = measured(*find_family("tanh"), kTruths[0].p, 1);
  const auto with = [&](auto change) {
    std::vector<FitDatum> data = all;
    change(data[4]);
    return refusal(data);
  };
  const double nan = std::numeric_limits<double>::quiet_NaN();
  CHECK(with([](FitDatum& d) { d.u = 0.0; }) ==
        "harmonic 5 of the fit: its uncertainty is 0; expected a number above 0");
  CHECK(with([](FitDatum& d) { d.input_peak = -1.0; }) ==
        "harmonic 5 of the fit: the input is -1; expected a peak above 0");
  CHECK(with([&](FitDatum& d) { d.value = nan; }) ==
        "harmonic 5 of the fit: its value is nan; expected a number");
  CHECK(with([](FitDatum& d) { d.order = -2; }) ==
        "harmonic 5 of the fit: its order is -2; expected 0 to 1000");
}

TEST_CASE("the same data give the same bits") {
  const std::vector<FitDatum> data = measured(*find_family("atan"), kTruths[1].p, 12);
  const FitResult a = fit_sigmoids(data, {}), b = fit_sigmoids(data, {});
  for (std::size_t i = 0; i < a.families.size(); ++i) {
    CHECK(a.families[i].limit.value == b.families[i].limit.value);
    CHECK(a.families[i].bias.standard_error == b.families[i].bias.standard_error);
    CHECK(a.families[i].aicc == b.families[i].aicc);
  }
}
