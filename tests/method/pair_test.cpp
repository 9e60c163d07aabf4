// SPDX-License-Identifier: GPL-3.0-or-later
// Any pair, any ratio: closed forms of a cubic, products to order 5, what falls together or past
// the highest frequency.
#include <doctest/doctest.h>

#include <cmath>
#include <numbers>

#include "curve/upright.h"
#include "method/synthetic.h"
#include "method/two_tone.h"
#include "quantity/failure.h"

using namespace kneeprint;
using kneeprint::testing::read;
using kneeprint::testing::response;
using kneeprint::testing::spec_for;

namespace {

// Signed amplitudes of y = x + a2 x^2 + a3 x^3 for x = u1 cos a + u2 cos b (expansion of the
// powers).
struct Cubic {
  double a2 = 0.02, a3 = -0.01;

  double operator()(double x) const { return x + a2 * x * x + a3 * x * x * x; }
  double product(int k1, int k2, double u1, double u2) const {
    const int a = std::abs(k1), b = std::abs(k2);
    if (a == 1 && b == 0) return u1 + a3 * (0.75 * u1 * u1 * u1 + 1.5 * u2 * u2 * u1);
    if (a == 0 && b == 1) return u2 + a3 * (0.75 * u2 * u2 * u2 + 1.5 * u1 * u1 * u2);
    if (a == 2 && b == 0) return a2 * u1 * u1 / 2.0;
    if (a == 0 && b == 2) return a2 * u2 * u2 / 2.0;
    if (a == 1 && b == 1) return a2 * u1 * u2;
    if (a == 3 && b == 0) return a3 * u1 * u1 * u1 / 4.0;
    if (a == 0 && b == 3) return a3 * u2 * u2 * u2 / 4.0;
    if (a == 2 && b == 1) return 0.75 * a3 * u1 * u1 * u2;
    if (a == 1 && b == 2) return 0.75 * a3 * u2 * u2 * u1;
    return 0.0;
  }
};

const IntermodPoint& row(const Curves& c, const std::string& product) {
  for (const IntermodPoint& p : c.intermods) {
    if (p.product == product) return p;
  }
  throw std::out_of_range(product);
}

const ProductPoint& line(const Curves& c, int k1, int k2) {
  for (const ProductPoint& p : c.products) {
    if ((p.k1 == k1 && p.k2 == k2) || (p.k1 == -k1 && p.k2 == -k2)) return p;
  }
  throw std::out_of_range("product");
}

struct Case {
  std::string method;
  std::vector<Hertz> tones;
  std::optional<double> ratio;
  double expected_ratio;
};

TakeSpec spec_of(const Case& c, double send, Hertz rate) {
  TakeSpec spec = spec_for(c.method, 0.0, send, rate);
  spec.options.tones = c.tones;
  spec.options.ratio = c.ratio;
  spec.hold_blocks = find_method(c.method)->first_hold_blocks(spec, rate);
  return spec;
}

// Twice the highest converter rate that the cubic of 20 kHz needs: nothing folds.
constexpr Hertz kFast{192000.0};

const std::vector<Case> kModulation{
    {"smpte", {}, {}, 4.0},
    {"din", {}, {}, 4.0},
    {"modulation", {Hertz(60.0), Hertz(7000.0)}, 10.0, 10.0},
    {"modulation", {Hertz(41.3), Hertz(7013.7)}, {}, 4.0},
    {"modulation", {Hertz(5000.0), Hertz(8010.0)}, 0.5, 0.5},  // f2 - 2 f1 is negative
};
const std::vector<Case> kDifference{
    {"ccif", {}, {}, 1.0},
    {"ccif", {Hertz(14000.0), Hertz(15000.0)}, {}, 1.0},
    {"ccif", {Hertz(11000.0), Hertz(12000.0)}, {}, 1.0},
    {"ccif", {Hertz(9960.0), Hertz(10040.0)}, {}, 1.0},
    {"tdfd", {}, {}, 1.0},
};

}  // namespace

TEST_CASE("modulation distortion of a cubic for any pair and ratio") {
  const Cubic cubic;
  for (const Case& c : kModulation) {
    CAPTURE(c.method);
    CAPTURE(c.expected_ratio);
    const TakeSpec spec = spec_of(c, -0.5, kFast);
    const Curves curves = read(spec, response(spec, cubic, 0.0, 1, kFast));
    const double peak = sine_peak(spec.send);
    const double u1 = peak * c.expected_ratio / (1.0 + c.expected_ratio), u2 = peak - u1;
    const auto over_f2 = [&](int k1, int k2) {
      return std::abs(cubic.product(k1, k2, u1, u2)) / cubic.product(0, 1, u1, u2);
    };
    const double m2 = 2.0 * over_f2(1, 1), m3 = 2.0 * over_f2(2, 1);
    const auto percent = [&](const char* product) { return *row(curves, product).percent; };
    CHECK(percent("m2") == doctest::Approx(100.0 * m2).epsilon(1e-9));
    CHECK(percent("m3") == doctest::Approx(100.0 * m3).epsilon(1e-9));
    CHECK(percent("total") == doctest::Approx(100.0 * std::hypot(m2, m3)).epsilon(1e-9));
    // A symmetric pair reads sqrt 2 higher as an arithmetic sum.
    CHECK(percent("m2-rss") == doctest::Approx(100.0 * m2 / std::numbers::sqrt2).epsilon(1e-9));
    CHECK(percent("m3-rss") == doctest::Approx(100.0 * m3 / std::numbers::sqrt2).epsilon(1e-9));
    CHECK(percent("total-rss") ==
          doctest::Approx(100.0 * std::hypot(m2, m3) / std::numbers::sqrt2).epsilon(1e-9));
    // A memoryless curve modulates the amplitude alone.
    CHECK(*row(curves, "m2").am_percent == doctest::Approx(100.0 * m2).epsilon(1e-9));
    CHECK(*row(curves, "m3").am_percent == doctest::Approx(100.0 * m3).epsilon(1e-9));
    CHECK(*row(curves, "m2").pm_percent < 1e-9);
    CHECK(row(curves, "m2").ratio == c.expected_ratio);
    if (!c.tones.empty()) {
      CHECK(row(curves, "m2").f1_hz == doctest::Approx(c.tones[0].value()).epsilon(0.001));
      CHECK(row(curves, "m2").f2_hz == doctest::Approx(c.tones[1].value()).epsilon(0.001));
    }
    for (const IntermodPoint& p : curves.intermods) CHECK(p.flag == Flag::none);
  }
}

TEST_CASE("the worked example: all four sidebands as root sum of squares") {
  // U1 0.8, U2 0.2, a2 0.02, a3 -0.01 (algebra): rss of the four sidebands over f2 2.385993021 %.
  const TakeSpec spec = spec_for("smpte", 0.0, 0.0);
  const Curves c = read(spec, response(spec, Cubic{}));
  CHECK(*row(c, "total-rss").percent == doctest::Approx(2.385993021).epsilon(1e-9));
}

TEST_CASE("difference-frequency distortion of a cubic for any pair") {
  const Cubic cubic;
  for (const Case& c : kDifference) {
    CAPTURE(c.method);
    CAPTURE(c.tones.size());
    const TakeSpec spec = spec_of(c, 0.0, kFast);
    const Curves curves = read(spec, response(spec, cubic, 0.0, 1, kFast));
    // U = 0.5: f1 = f2 0.4971875; f2-f1 0.005; 2f1-f2 = 2f2-f1 -0.0009375.
    const auto percent = [&](const char* product) { return *row(curves, product).percent; };
    if (c.method == "tdfd") {
      CHECK(percent("total") == doctest::Approx(0.511590842).epsilon(1e-9));
      CHECK(curves.intermods.size() == 1);
      CHECK(line(curves, -1, 1).frequency_hz == 3950.0);
      CHECK(line(curves, 2, -1).frequency_hz == 4050.0);
      continue;
    }
    CHECK(percent("d2") == doctest::Approx(0.502828410).epsilon(1e-9));
    CHECK(percent("d3") == doctest::Approx(0.188560654).epsilon(1e-9));
    CHECK(percent("total") == doctest::Approx(std::hypot(0.502828410, 0.188560654)).epsilon(1e-9));
    CHECK(percent("d3-rss") == doctest::Approx(0.188560654 / std::numbers::sqrt2).epsilon(1e-9));
    CHECK(
        percent("total-rss") ==
        doctest::Approx(std::hypot(0.502828410, 0.188560654 / std::numbers::sqrt2)).epsilon(1e-9));
  }
}

TEST_CASE("every product to order 5: frequency, level, phase") {
  const Cubic cubic;
  for (const Case& c : {kModulation[1], kModulation[4], kDifference[1], kDifference[4]}) {
    CAPTURE(c.method);
    const TakeSpec spec = spec_of(c, -3.0, kFast);
    const Curves curves = read(spec, response(spec, cubic, 0.0, 1, kFast));
    const double peak = sine_peak(spec.send);
    const double u1 = peak * c.expected_ratio / (1.0 + c.expected_ratio), u2 = peak - u1;
    CHECK(curves.products.size() == 30);  // 2 n of each order n
    const double t1 = cubic.product(1, 0, u1, u2), t2 = cubic.product(0, 1, u1, u2);
    const double reference = c.method == "ccif" || c.method == "tdfd" ? t1 + t2 : t2;
    for (const ProductPoint& p : curves.products) {
      CAPTURE(p.k1);
      CAPTURE(p.k2);
      CHECK(p.frequency_hz == doctest::Approx(p.k1 * p.f1_hz + p.k2 * p.f2_hz).epsilon(1e-12));
      CHECK(p.order == std::abs(p.k1) + std::abs(p.k2));
      if (p.frequency_hz > 20000.0 / 44100.0 * kFast.value()) {
        CHECK(p.flag == Flag::alias);
        CHECK(p.note == "past the highest frequency shown");
        CHECK_FALSE(p.level.has_value());
        continue;
      }
      CHECK(p.note == "-");
      const double truth = cubic.product(p.k1, p.k2, u1, u2);
      if (p.order > 3) {
        CHECK(p.level.value_or(-400.0) < -250.0);
        continue;
      }
      CHECK(p.flag == Flag::none);
      CHECK(std::pow(10.0, *p.level / 20.0) == doctest::Approx(std::abs(truth)).epsilon(1e-9));
      CHECK(std::pow(10.0, *p.relative_db / 20.0) ==
            doctest::Approx(std::abs(truth) / reference).epsilon(1e-9));
      CHECK(std::abs(*p.phase_deg) == doctest::Approx(truth > 0.0 ? 0.0 : 180.0).epsilon(1e-6));
    }
  }
}

TEST_CASE("an inverting unit's products are turned upright") {
  const Cubic cubic;
  const TakeSpec spec = spec_for("din", 0.0, -6.0);
  const Curves upright = read(spec, response(spec, cubic));
  Curves inverted = read(spec, response(spec, [&](double x) { return -cubic(x); }));
  CHECK(std::abs(*line(inverted, 1, 1).phase_deg) == doctest::Approx(180.0));
  make_upright(inverted, -1);
  int compared = 0;
  for (std::size_t i = 0; i < upright.products.size(); ++i) {
    const ProductPoint &a = upright.products[i], &b = inverted.products[i];
    if (a.order > 3 || !a.phase_deg) continue;
    const double apart = std::remainder(*a.phase_deg - *b.phase_deg, 360.0);
    CHECK(std::abs(apart) < 1e-6);
    ++compared;
  }
  CHECK(compared >= 10);
}

TEST_CASE("a filter behind the curve turns products by what its phase leaves") {
  // One sample of delay is a straight phase: k1 and k2 times the tones' phases take it off.
  const Cubic cubic;
  const TakeSpec spec = spec_for("din", 0.0, -6.0);
  Waveform take = response(spec, cubic);
  take.samples.insert(take.samples.begin(), 0.0);
  take.samples.pop_back();
  const Curves c = read(spec, take);
  CHECK(std::abs(*line(c, 1, 1).phase_deg) < 1e-6);
  CHECK(std::abs(*line(c, 2, 1).phase_deg) == doctest::Approx(180.0));
}

TEST_CASE("intermodulation over harmonics of a cubic: +6.02 dB and +9.54 dB at equal tones") {
  // Each tone as large as the single one: IM2/HD2 = 2, IM3/HD3 = 3 (algebra), one product over one
  // tone. Compression 3/4 a3 A^2 is 2e-6, so 1e-4 dB is far above what it does.
  const Cubic cubic{0.02, -0.001};
  const double single = -26.0, twin = single + 20.0 * std::log10(2.0);
  const TakeSpec sine = spec_for("steady", 997.0, single);
  const Curves h = read(sine, response(sine, cubic));
  const TakeSpec pair = spec_for("ccif", 0.0, twin, kFast);
  const Curves p = read(pair, response(pair, cubic, 0.0, 1, kFast));
  const auto over_tone = [&](int k1, int k2) {
    return *line(p, k1, k2).level - *line(p, 1, 0).level;
  };
  CHECK(std::abs(over_tone(-1, 1) - *h.harmonics[1].relative_db - 6.020600) < 1e-4);
  CHECK(std::abs(over_tone(1, 1) - *h.harmonics[1].relative_db - 6.020600) < 1e-4);
  CHECK(std::abs(over_tone(2, -1) - *h.harmonics[2].relative_db - 9.542425) < 1e-4);
  CHECK(std::abs(over_tone(-1, 2) - *h.harmonics[2].relative_db - 9.542425) < 1e-4);
}

TEST_CASE("order n rises by n dB per dB") {
  const Cubic cubic;
  for (const char* method : {"smpte", "ccif"}) {
    const TakeSpec low = spec_for(method, 0.0, -40.0), high = spec_for(method, 0.0, -39.0);
    const Curves a = read(low, response(low, cubic)), b = read(high, response(high, cubic));
    CHECK(*line(b, -1, 1).level - *line(a, -1, 1).level == doctest::Approx(2.0).epsilon(1e-9));
    CHECK(*line(b, 2, -1).level - *line(a, 2, -1).level == doctest::Approx(3.0).epsilon(1e-9));
  }
}

TEST_CASE("products that fall on one another: both rows say so and hold the sum") {
  const Cubic cubic;
  Case c{"ccif", {Hertz(8000.0), Hertz(12000.0)}, {}, 1.0};
  const TakeSpec spec = spec_of(c, 0.0, kFast);
  const Curves curves = read(spec, response(spec, cubic, 0.0, 1, kFast));
  const ProductPoint &second = line(curves, -1, 1), &third = line(curves, 2, -1);
  CHECK(second.frequency_hz == 4000.0);
  CHECK(third.frequency_hz == 4000.0);
  CHECK(second.note == "falls on 2f1-f2");
  CHECK(third.note == "falls on f2-f1");
  const double sum = cubic.product(1, 1, 0.5, 0.5) + cubic.product(2, 1, 0.5, 0.5);
  for (const ProductPoint* p : {&second, &third}) {
    CHECK(std::pow(10.0, *p->level / 20.0) == doctest::Approx(std::abs(sum)).epsilon(1e-9));
  }
  CHECK(line(curves, 3, -2).note == "falls on dc");
  CHECK_FALSE(line(curves, 3, -2).level.has_value());
  // A figure of one order cannot be read there: empty, and so not compared with a prediction.
  for (const IntermodPoint& p : curves.intermods) CHECK_FALSE(p.db.has_value());
}

TEST_CASE("products past the highest frequency at 44.1 and 48 kHz") {
  const Cubic cubic;
  for (const double rate : {44100.0, 48000.0}) {
    const TakeSpec spec = spec_for("ccif", 0.0, -6.0, Hertz(rate));
    const Curves c = read(spec, response(spec, cubic, 0.0, 1, Hertz(rate)));
    CHECK(line(c, 1, 1).flag == Flag::alias);
    CHECK(line(c, 1, 1).note == "past the highest frequency shown");
    CHECK(line(c, 0, 1).flag == Flag::none);  // the tone at 20 kHz itself
    CHECK((line(c, -1, 2).flag == Flag::alias) == (rate < 48000.0));
    CHECK((row(c, "d3-rss").flag == Flag::alias) == (rate < 48000.0));
    CHECK((row(c, "total-rss").flag == Flag::alias) == (rate < 48000.0));
    CHECK(row(c, "d2").flag == Flag::none);
  }
  // What a recording at a lower rate cannot show.
  RigView rig;
  rig.recorded_rate = Hertz(32000.0);
  const TakeSpec spec = spec_for("tdfd", 0.0, -6.0);
  const Curves c = read(spec, response(spec, cubic), rig);
  CHECK(line(c, -1, 2).flag == Flag::alias);
  CHECK(row(c, "total").flag == Flag::none);
}

TEST_CASE("a weakly bent rig: its product of any order from its harmonic") {
  // x + a x^n: products of order n are a C(n, |k1|) U1^|k1| U2^|k2| / 2^(n-1), the harmonic of a
  // sine of peak P is a P^n / 2^(n-1).
  for (int n = 2; n <= 5; ++n) {
    CAPTURE(n);
    const double a = 1e-3;
    Case c{"modulation", {Hertz(700.0), Hertz(9010.0)}, 3.0, 3.0};
    const TakeSpec spec = spec_of(c, 0.0, kFast);
    const Curves curves =
        read(spec, response(
                       spec, [&](double x) { return x + a * std::pow(x, n); }, 0.0, 1, kFast));
    for (const ProductPoint& p : curves.products) {
      if (p.order != n || p.flag == Flag::alias) continue;
      CAPTURE(p.k1);
      CAPTURE(p.k2);
      const double harmonic = a / std::pow(2.0, n - 1);
      CHECK(std::pow(10.0, *p.level / 20.0) ==
            doctest::Approx(harmonic * over_harmonic({p.k1, p.k2}, 0.75, 0.25)).epsilon(1e-8));
    }
  }
}

TEST_CASE("the rig floor of every pair follows from its harmonics, unless it was measured") {
  const double h2 = 1e-4, h3 = 1e-5;  // of the loop; send and return are added in magnitude
  std::vector<FloorPoint> points;
  for (const double level : {-60.0, 20.0}) {
    points.push_back({LevelDbfs(level), 2, Decibels::of_ratio(h2)});
    points.push_back({LevelDbfs(level), 3, Decibels::of_ratio(h3)});
  }
  RigView rig;
  rig.floor = RigFloor(points);
  const auto floor = [&](const Case& c, const char* product) {
    const TakeSpec spec = spec_of(c, -6.0, Hertz(48000.0));
    return std::pow(
        10.0, *row(read(spec, response(spec, Cubic{0.2, -0.2}), rig), product).floor_db / 20.0);
  };
  // m2 = 2 a2 U1 / a1 over HD2 = a2 P / 2 a1, m3 = 3/2 a3 U1^2 / a1 over HD3 = a3 P^2 / 4 a1.
  CHECK(floor(kModulation[0], "m2") == doctest::Approx(2.0 * 3.2 * h2).epsilon(1e-9));
  CHECK(floor(kModulation[0], "m3") == doctest::Approx(2.0 * 3.84 * h3).epsilon(1e-9));
  CHECK(floor(kModulation[0], "m2-rss") == doctest::Approx(2.0 * 2.262742 * h2).epsilon(1e-6));
  CHECK(floor(kModulation[2], "m2") == doctest::Approx(2.0 * 40.0 / 11.0 * h2).epsilon(1e-9));
  CHECK(floor(kModulation[2], "m3") == doctest::Approx(2.0 * 600.0 / 121.0 * h3).epsilon(1e-9));
  CHECK(floor(kDifference[0], "d2") == doctest::Approx(2.0 * 0.5 * h2).epsilon(1e-9));
  CHECK(floor(kDifference[0], "d3") == doctest::Approx(2.0 * 0.75 * h3).epsilon(1e-9));
  CHECK(floor(kDifference[4], "total") ==
        doctest::Approx(2.0 * std::hypot(0.5 * h2, 0.375 * h3)).epsilon(1e-9));

  FloorPoint measured{LevelDbfs(-60.0), 0, Decibels(-70.0)};
  measured.product = "ccif d2";
  points.push_back(measured);
  measured.level = LevelDbfs(20.0);
  points.push_back(measured);
  rig.floor = RigFloor(points);
  CHECK(floor(kDifference[0], "d2") == doctest::Approx(2.0 * std::pow(10.0, -3.5)).epsilon(1e-9));
  CHECK(floor(kDifference[1], "d2") == doctest::Approx(2.0 * 0.5 * h2).epsilon(1e-9));
}

TEST_CASE("the return's response is taken out of every product") {
  // The loop falls by 8 dB from 1 to 18 kHz, all of it in the return: tones arrive 8 dB low.
  RigView rig;
  rig.response = LoopResponse(
      {{Hertz(1000.0), Decibels(0.0), 0.0}, {Hertz(18000.0), Decibels(-8.0), -90.0}}, 1.0);
  const TakeSpec spec = spec_for("ccif", 0.0, -6.0);
  const Stimulus s = find_method("ccif")->stimulus(spec, Hertz(48000.0));
  Waveform take = s.wave;
  const double g = Decibels(-8.0).ratio(), turn = -std::numbers::pi / 2.0;
  for (std::size_t n = s.hold.first_block; n < s.hold.end(); ++n) {
    const double t = 2.0 * std::numbers::pi * static_cast<double>(n - s.hold.first_block) / 48000.0;
    take.samples[n] = 0.2 * g * std::cos(19000.0 * t + turn) +
                      0.2 * g * std::cos(20000.0 * t + turn) + 0.004 * std::cos(1000.0 * t) +
                      0.001 * g * std::cos(18000.0 * t + turn + 0.5);
  }
  const Curves c = read(spec, take, rig);
  CHECK(*row(c, "d2").percent == doctest::Approx(1.0).epsilon(1e-9));
  CHECK(*line(c, 1, 0).level == doctest::Approx(20.0 * std::log10(0.2)).epsilon(1e-9));
  CHECK(*line(c, 2, -1).phase_deg == doctest::Approx(0.5 * 180.0 / std::numbers::pi).epsilon(1e-9));
  CHECK(std::abs(*line(c, -1, 1).phase_deg) < 1e-6);
}

TEST_CASE("noise alone passes for a pair of products in at most 5 % of takes") {
  // 300 takes; 27 is the 99.9 % point of the binomial with 5 %.
  TakeSpec spec = spec_for("ccif", 0.0, -20.0);
  spec.settings.block = Seconds(0.1);
  spec.settings.blocks = 3;
  spec.hold_blocks = find_method("ccif")->first_hold_blocks(spec, Hertz(48000.0));
  int sum = 0, root_sum = 0;
  for (unsigned seed = 1; seed <= 300; ++seed) {
    const Curves c = read(spec, response(
                                    spec, [](double x) { return x; }, 1e-4, seed));
    sum += row(c, "d3").flag != Flag::noise;
    root_sum += row(c, "d3-rss").flag != Flag::noise;
  }
  CHECK(sum <= 27);
  CHECK(root_sum <= 27);
}

TEST_CASE("pairs that a rate cannot carry, or that share no cycles, are refused") {
  const auto check = [](const char* method, std::vector<Hertz> tones, double rate) {
    StepOptions o;
    o.tones = std::move(tones);
    find_method(method)->check(o, Hertz(rate));
  };
  check("ccif", {}, 44100.0);
  check("ccif", {Hertz(19000.0), Hertz(20000.0)}, 44100.0);
  check("modulation", {Hertz(33.3), Hertz(5123.4)}, 44100.0);
  CHECK_THROWS_AS(check("ccif", {}, 32000.0), InputError);
  CHECK_THROWS_AS(check("ccif", {Hertz(21000.0), Hertz(22000.0)}, 48000.0), InputError);
  CHECK_THROWS_AS(check("modulation", {Hertz(1000.0), Hertz(1000.01)}, 48000.0), InputError);
  CHECK_THROWS_AS(check("modulation", {Hertz(0.01), Hertz(1000.0)}, 48000.0), InputError);
}
