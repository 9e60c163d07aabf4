// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/square_sine.h"

#include <doctest/doctest.h>

#include <cmath>
#include <numbers>

#include "method/dim_signal.h"
#include "method/synthetic.h"
#include "quantity/failure.h"

using namespace kneeprint;
using kneeprint::testing::read;
using kneeprint::testing::response;
using kneeprint::testing::spec_for;

namespace {

constexpr Hertz kRate{96000.0};

const ScalarPoint& scalar(const Curves& c, const std::string& figure, const std::string& state) {
  for (const ScalarPoint& p : c.scalars) {
    if (p.figure == figure && p.state == state) return p;
  }
  throw std::out_of_range(figure);
}

// The square at a time in its own period 0 .. 1, straight from its series.
double wave(const PlayedSquare& s, double turns, bool derivative) {
  double y = 0.0;
  for (std::size_t n = 1; n < s.harmonics.size(); ++n) {
    const double a = 2.0 * std::numbers::pi * static_cast<double>(n);
    const auto phasor = s.harmonics[n] * std::polar(1.0, a * turns);
    y += derivative ? -a * kSquarePlayed.value() * phasor.imag() : phasor.real();
  }
  return y;
}

}  // namespace

TEST_CASE("harmonics of the square through one pole") {
  // 4 / (pi n) / sqrt(1 + (f / pole)^2) (algebra, printed to nine places).
  const double at30[] = {1.266278320, 0.404804718, 0.225464725, 0.146561531,
                         0.102822802, 0.075764312, 0.057881400, 0.045497784};
  const double at100[] = {1.272608328, 0.422530722, 0.251547052, 0.177624537,
                          0.136107137, 0.109369532, 0.090636461, 0.076746776};
  for (int i = 0; i < 8; ++i) {
    const int n = 2 * i + 1;
    CHECK(std::abs(std::abs(square_harmonic(n, kDimSquare, kDim30Pole)) - at30[i]) < 1e-8);
    CHECK(std::abs(std::abs(square_harmonic(n, kDimSquare, kDim100Pole)) - at100[i]) < 1e-8);
  }
  CHECK(square_harmonic(2, kDimSquare, kDim30Pole) == 0.0);
}

TEST_CASE("the nine products of 15 kHz and 3.15 kHz") {
  const double expected[] = {11850, 8700, 5550, 2400, 750, 3900, 7050, 10200, 13350};
  const auto products = dim_products();
  for (std::size_t i = 0; i < 9; ++i) {
    CHECK(products[i].k1 * kDimSquare.value() + products[i].k2 * kDimSine.value() == expected[i]);
  }
}

TEST_CASE("the square as played: peak, slope and their shares of the standard's") {
  for (const double rate : {96000.0, 192000.0}) {
    CAPTURE(rate);
    const PlayedSquare s = played_square(Hertz(rate));
    CHECK(s.band_limit.value() < 0.45 * rate);
    CHECK(s.band_limit.value() > 0.45 * rate - 2.0 * kSquarePlayed.value());
    double peak = 0.0, slope = 0.0;
    for (int i = 0; i < 20000; ++i) {
      peak = std::max(peak, std::abs(wave(s, i / 20000.0, false)));
      slope = std::max(slope, std::abs(wave(s, i / 20000.0, true)));
    }
    // Two grids, each within 1e-4 of the true peak.
    CHECK(s.peak == doctest::Approx(peak).epsilon(2e-4));
    CHECK(s.steepest_slope == doctest::Approx(slope).epsilon(2e-4));
    CHECK(s.peak < 1.02);  // faded, not cut off: a cut rings by 11 % at 96 kHz
    MESSAGE("at ", rate, " Hz: ", s.steepest_slope / steepest_slope(kDimSquare, kDim30Pole),
            " of DIM 30's slope, ", s.steepest_slope / steepest_slope(kDimSquare, kDim100Pole),
            " of DIM 100's, peak ", s.peak);
  }
  // With all the bandwidth in the world it is the standard's own.
  const PlayedSquare s = played_square(Hertz(5e6));
  CHECK(s.steepest_slope / steepest_slope(kSquarePlayed, kDim30Pole) ==
        doctest::Approx(1.0).epsilon(0.03));
  // One pole: 2 / tau, since half a period is 30 time constants.
  CHECK(steepest_slope(kDimSquare, kDim30Pole) ==
        doctest::Approx(4.0 * std::numbers::pi * 30000.0).epsilon(1e-12));
}

TEST_CASE("square and sine stand 4:1, and their peak is the sine's of that level") {
  const TakeSpec spec = spec_for("square-sine", 0.0, -6.0, kRate);
  const Curves c = read(spec, response(
                                  spec, [](double x) { return x; }, 0.0, 1, kRate));
  const PlayedSquare s = played_square(kRate);
  const double top = sine_peak(spec.send) / (s.peak + 0.25);
  REQUIRE(c.products.size() == 11);
  CHECK(std::pow(10.0, *c.products[0].level / 20.0) ==
        doctest::Approx(top * std::abs(s.harmonics[1])).epsilon(1e-9));
  CHECK(std::pow(10.0, *c.products[1].level / 20.0) == doctest::Approx(top / 4.0).epsilon(1e-9));
  CHECK(*scalar(c, "band-limit", "-").value == s.band_limit.value());
  const double of30 = *scalar(c, "slope-fraction", "dim-30").value;
  CHECK(of30 > 0.1);
  CHECK(of30 < 1.0);
  CHECK(*scalar(c, "slope-fraction", "dim-100").value == doctest::Approx(0.3 * of30).epsilon(1e-9));
  // A straight wire shows none of the nine.
  for (std::size_t i = 2; i < 11; ++i) CHECK(*c.products[i].relative_db < -250.0);
}

TEST_CASE("products of a square law are its coefficient times the square's harmonics") {
  // x + a x^2: harmonic S_k of the square and the sine s give a S_k s at |f2 - k f1|, over the sine
  // a S_k; even k have no harmonic to come from.
  const double a = 0.01;
  const TakeSpec spec = spec_for("square-sine", 0.0, -6.0, kRate);
  const Curves c = read(spec, response(
                                  spec, [&](double x) { return x + a * x * x; }, 0.0, 1, kRate));
  const PlayedSquare s = played_square(kRate);
  const double top = sine_peak(spec.send) / (s.peak + 0.25);
  double squares = 0.0;
  for (std::size_t k = 1; k <= 9; ++k) {
    const ProductPoint& p = c.products[k + 1];
    CAPTURE(k);
    CHECK(p.frequency_hz == std::abs(15000.0 - static_cast<double>(k) * 3152.0));
    CHECK(std::remainder(p.frequency_hz, 50.0) != 0.0);
    CHECK(p.note == "-");
    if (k % 2 == 0) {
      CHECK(p.relative_db.value_or(-400.0) < -250.0);
      continue;
    }
    const double ratio = a * top * std::abs(s.harmonics[k]);
    squares += ratio * ratio;
    CHECK(std::pow(10.0, *p.relative_db / 20.0) == doctest::Approx(ratio).epsilon(1e-9));
    CHECK(p.flag == Flag::none);
  }
  REQUIRE(c.intermods.size() == 1);
  const IntermodPoint& row = c.intermods.front();
  CHECK(row.product == "square-sine");
  CHECK(row.ratio == 4.0);
  CHECK(*row.percent == doctest::Approx(100.0 * std::sqrt(squares)).epsilon(1e-9));
  CHECK(row.flag == Flag::none);
}

TEST_CASE("the rig's own square law reads as its floor") {
  // A rig of the same law as a unit: what it shows with a sine of the return's peak P is a P / 2.
  const double a = 1e-3;
  const TakeSpec spec = spec_for("square-sine", 0.0, -6.0, kRate);
  const Waveform take = response(
      spec, [&](double x) { return x + a * x * x; }, 0.0, 1, kRate);
  RigView rig;
  std::vector<FloorPoint> points;
  const double half = 0.5 * a * sine_peak(spec.send) / 2.0;  // send and return are added
  for (const double level : {-60.0, 20.0}) {
    points.push_back({LevelDbfs(level), 2, Decibels::of_ratio(half)});
    points.push_back({LevelDbfs(level), 3, Decibels(-200.0)});
  }
  rig.floor = RigFloor(points);
  const IntermodPoint row = read(spec, take, rig).intermods.front();
  // The peak of the take is found among its samples.
  CHECK(*row.floor_db == doctest::Approx(*row.db).epsilon(2e-4));
}

TEST_CASE("under the noise the figure is an upper limit; below 96 kHz it is not offered") {
  const TakeSpec spec = spec_for("square-sine", 0.0, -20.0, kRate);
  const Curves c = read(spec, response(
                                  spec, [](double x) { return x; }, 1e-3, 5, kRate));
  CHECK(c.intermods.front().flag == Flag::noise);
  const auto check = find_method("square-sine")->check;
  check({}, kRate);
  CHECK_THROWS_AS(check({}, Hertz(88200.0)), InputError);
}
