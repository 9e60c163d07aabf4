// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/two_tone.h"

#include <doctest/doctest.h>

#include <cmath>

#include "method/synthetic.h"

using namespace kneeprint;
using kneeprint::testing::read;
using kneeprint::testing::response;
using kneeprint::testing::spec_for;

namespace {

double cubic(double x) { return x + 0.02 * x * x - 0.01 * x * x * x; }

const IntermodPoint& row(const Curves& c, const std::string& product) {
  for (const IntermodPoint& p : c.intermods) {
    if (p.product == product) return p;
  }
  throw std::out_of_range(product);
}

}  // namespace

TEST_CASE("smpte products of a cubic, exact amplitudes") {
  // y = x + 0.02 x^2 - 0.01 x^3, U1 0.8, U2 0.2: f2 0.19802, f2+-f1 0.0032, f2+-2f1 -0.00096
  // (algebra).
  const TakeSpec spec = spec_for("smpte", 0.0, 0.0);
  const Curves c = read(spec, response(spec, cubic));
  CHECK(*row(c, "m2").percent == doctest::Approx(3.231996768).epsilon(1e-9));
  CHECK(*row(c, "m3").percent == doctest::Approx(0.969599030).epsilon(1e-9));
  CHECK(*row(c, "total").percent == doctest::Approx(3.374303689).epsilon(1e-9));
  CHECK(*row(c, "m2").am_percent == doctest::Approx(3.231996768).epsilon(1e-9));
  CHECK(*row(c, "m2").pm_percent < 1e-9);
  CHECK(row(c, "m2").f1_hz == 60.0);
  CHECK(row(c, "m2").f2_hz == 7000.0);
}

TEST_CASE("ccif products of a cubic, referred to the sum of both tones") {
  const TakeSpec spec = spec_for("ccif", 0.0, 0.0);
  const Curves c = read(spec, response(spec, cubic));
  CHECK(*row(c, "d2").percent == doctest::Approx(0.502828410).epsilon(1e-9));
  CHECK(*row(c, "d3").percent == doctest::Approx(0.188560654).epsilon(1e-9));
  CHECK(*row(c, "total").percent ==
        doctest::Approx(std::hypot(0.502828410, 0.188560654)).epsilon(1e-9));
}

TEST_CASE("pure phase modulation reads as PM, not as AM") {
  const TakeSpec spec = spec_for("smpte", 0.0, -6.0);
  const Stimulus s = find_method("smpte")->stimulus(spec, Hertz(48000.0));
  Waveform take = s.wave;
  const double u1 = 0.8 * sine_peak(spec.send), u2 = 0.2 * sine_peak(spec.send);
  for (std::size_t n = s.hold.first_block; n < s.hold.end(); ++n) {
    const double t = 2.0 * std::numbers::pi * static_cast<double>(n - s.hold.first_block) / 48000.0;
    take.samples[n] =
        u1 * std::cos(60.0 * t) + u2 * std::cos(7000.0 * t + 0.01 * std::cos(60.0 * t));
  }
  const Curves c = read(spec, take);
  // Index 0.01: sidebands J1(0.01) / J0(0.01) = 0.005 each, in quadrature.
  CHECK(*row(c, "m2").pm_percent == doctest::Approx(1.0).epsilon(1e-4));
  CHECK(*row(c, "m2").am_percent < 1e-6);
}

TEST_CASE("what stands on the sidebands with f2 alone is not called intermodulation") {
  const TakeSpec spec = spec_for("smpte", 0.0, -6.0);
  const Stimulus s = find_method("smpte")->stimulus(spec, Hertz(48000.0));
  Waveform take = s.wave;
  // A tone at 7060 Hz that belongs to the rig: it is there all the time.
  for (std::size_t n = 0; n < take.samples.size(); ++n) {
    take.samples[n] +=
        1e-4 * std::cos(2.0 * std::numbers::pi * 7060.0 * static_cast<double>(n) / 48000.0);
  }
  CHECK(row(read(spec, take), "m2").flag == Flag::floor);
  // The same sideband only while both tones sound is the unit's.
  Waveform honest = response(spec, [](double x) { return x + 0.005 * x * x; });
  CHECK(row(read(spec, honest), "m2").flag == Flag::none);
}

TEST_CASE(
    "products under the noise are upper limits; at 44.1 kHz the upper d3 product is out of reach") {
  const TakeSpec spec = spec_for("ccif", 0.0, -20.0);
  const Curves c = read(spec, response(
                                  spec, [](double x) { return x; }, 1e-4, 3));
  CHECK(row(c, "d2").flag == Flag::noise);
  CHECK(*row(c, "d2").percent > 0.0);

  const TakeSpec cd = spec_for("ccif", 0.0, -6.0, Hertz(44100.0));
  const Curves at_cd = read(cd, response(cd, cubic, 0.0, 1, Hertz(44100.0)));
  CHECK(row(at_cd, "d3").flag == Flag::alias);
  CHECK(row(at_cd, "d2").flag == Flag::none);
  CHECK(row(at_cd, "total").flag == Flag::alias);
}

TEST_CASE("predictions by a curve agree with its measured products") {
  // The exact cubic amplitudes stand in for the two-tone analysis of a curve.
  const TwoToneCurve exact = [](double u1, double u2,
                                const std::vector<std::pair<int, int>>& products) {
    std::vector<double> out;
    for (const auto& [k1, k2] : products) {
      const int a = std::abs(k1), b = std::abs(k2);
      const double a2 = 0.02, a3 = -0.01;
      if (a == 1 && b == 0) out.push_back(u1 + a3 * (0.75 * u1 * u1 * u1 + 1.5 * u2 * u2 * u1));
      if (a == 0 && b == 1) out.push_back(u2 + a3 * (0.75 * u2 * u2 * u2 + 1.5 * u1 * u1 * u2));
      if (a == 1 && b == 1) out.push_back(a2 * u1 * u2);
      if (a == 2 && b == 1) out.push_back(0.75 * a3 * u1 * u1 * u2);
      if (a == 1 && b == 2) out.push_back(0.75 * a3 * u2 * u2 * u1);
    }
    return out;
  };
  for (const std::string method : {"smpte", "ccif"}) {
    const TakeSpec spec = spec_for(method, 0.0, 0.0);
    const Curves c = read(spec, response(spec, cubic));
    for (const PredictedProduct& p : find_method(method)->predict(exact, {}, 1.0)) {
      CAPTURE(p.product);
      CHECK(100.0 * p.ratio == doctest::Approx(*row(c, p.product).percent).epsilon(1e-9));
    }
  }
}
