// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/steady.h"

#include <doctest/doctest.h>

#include <cmath>
#include <numbers>
#include <tuple>
#include <vector>

#include "method/synthetic.h"

using namespace kneeprint;
using kneeprint::testing::read;
using kneeprint::testing::response;
using kneeprint::testing::spec_for;

namespace {

// Signed peak of order n as the reading gives it: upright phasors are real for a memoryless curve.
double peak(const Curves& c, int order) { return c.harmonics.at(order - 1).in_phase; }

}  // namespace

TEST_CASE("a polynomial's harmonic series") {
  // a = (0, 1, 0.1, -0.05, 0.02, 0.01), A = 0.8, b = 0: exact decimals by expanding cos^n.
  const auto curve = [](double x) {
    return x + 0.1 * x * x - 0.05 * x * x * x + 0.02 * std::pow(x, 4) + 0.01 * std::pow(x, 5);
  };
  const TakeSpec spec = spec_for("steady", 997.0, 20.0 * std::log10(0.8));
  const Curves c = read(spec, response(spec, curve));
  const double expected[] = {0.782848, 0.036096, -0.005376, 0.001024, 0.0002048};
  for (int n = 1; n <= 5; ++n) {
    CAPTURE(n);
    CHECK(std::abs(peak(c, n) - expected[n - 1]) < 1e-12);
  }
  CHECK(std::abs(*c.harmonics[1].phase_deg) < 1e-6);                    // a2 > 0: with the crest
  CHECK(std::abs(std::abs(*c.harmonics[2].phase_deg) - 180.0) < 1e-6);  // a3 < 0: compressive
  CHECK(*c.harmonics[1].relative_db ==
        doctest::Approx(20.0 * std::log10(0.036096 / 0.782848)).epsilon(1e-12));
}

TEST_CASE("Chebyshev T5 at full scale is its fifth harmonic alone") {
  const auto t5 = [](double x) { return 0.5 * x + 16 * std::pow(x, 5) - 20 * x * x * x + 5 * x; };
  const TakeSpec spec = spec_for("steady", 997.0, 0.0);
  const Curves c = read(spec, response(spec, t5));
  CHECK(std::abs(peak(c, 1) - 0.5) < 1e-12);
  CHECK(std::abs(peak(c, 5) - 1.0) < 1e-12);
  for (const int n : {2, 3, 4, 6, 7}) CHECK(std::abs(peak(c, n)) < 1e-12);
}

TEST_CASE("exponential: modified Bessel functions (DLMF 10.35.2)") {
  const TakeSpec spec = spec_for("steady", 997.0, 20.0 * std::log10(0.5));
  RigView rig;
  rig.sees_dc = true;
  const Curves c = read(spec, response(spec, [](double x) { return std::exp(x) - 1.0; }), rig);
  // I_n(0.5), Abramowitz & Stegun 9.8 and 9.9.
  const double i[] = {1.06348337074132,    0.257894305390896,    0.0319061491777383,
                      0.00264511196899029, 0.000164805549854824, 8.223171313109e-6};
  CHECK(std::abs(*c.levels[0].dc - (i[0] - 1.0)) < 1e-12);
  for (int n = 1; n <= 5; ++n) CHECK(std::abs(peak(c, n) - 2.0 * i[n]) < 1e-12);
}

TEST_CASE("hard clipper and the square-wave limit, at a low frequency where aliases stay small") {
  // 4 A/L, 41 Hz: 585 orders fit below half the rate; what folds is bounded by the tail of 1/n^2.
  const TakeSpec spec = spec_for("steady", 41.0, 0.0);
  const Curves c = read(spec, response(spec, [](double x) { return std::clamp(x, -0.5, 0.5); }));
  // A/L = 2: H1 +1.217995562088, H3 -0.275664447711, H5 +0.055132889542 for L = 1 (closed form of
  // the describing function's harmonics), halved here.
  CHECK(std::abs(peak(c, 1) - 0.5 * 1.217995562088) < 1e-5);
  CHECK(std::abs(peak(c, 3) + 0.5 * 0.275664447711) < 1e-5);
  CHECK(std::abs(peak(c, 5) - 0.5 * 0.055132889542) < 1e-5);

  TakeSpec square = spec_for("steady", 41.0, 0.0);
  square.settings.orders = 20;
  const Curves s = read(square, response(square, [](double x) { return x > 0 ? 0.5 : -0.5; }));
  // sqrt(sum 1/n^2, n = 3, 5 ... 19) = 45.6860275272 %; all orders: sqrt(pi^2/8 - 1) = 48.34258 %.
  CHECK(*s.levels[0].thd_f_percent == doctest::Approx(45.6860275272).epsilon(2e-4));
  CHECK(s.levels[0].thd_orders == 20);
  // THD+N up to 20 kHz takes in orders to 487: 48.34 % less the tail beyond (sum of 1/n^2 over odd
  // n from 489: 1/976), plus what sampling folds back of the orders above 24 kHz (1/1170, spread
  // evenly over 24 kHz), over the total.
  const double below_20k =
      std::sqrt(std::pow(0.483425847608679, 2) - 1.0 / 976.0 + 20.0 / 24.0 / 1170.0);
  CHECK(*s.levels[0].thdn_percent ==
        doctest::Approx(100.0 * below_20k / std::hypot(1.0, below_20k)).epsilon(2e-4));
}

TEST_CASE("THD_R follows THD_F, SINAD is the other side of the residual") {
  const TakeSpec spec = spec_for("steady", 997.0, -6.0);
  const Curves c = read(
      spec, response(spec, [](double x) { return std::tanh(2.0 * x + 0.3) - std::tanh(0.3); }));
  const LevelPoint& p = c.levels[0];
  const double f = *p.thd_f_percent / 100.0;
  CHECK(*p.thd_r_percent / 100.0 == doctest::Approx(f / std::sqrt(1 + f * f)).epsilon(1e-12));
  const double n = *p.thdn_percent / 100.0;
  // SINAD = H1 / residual, THD+N = residual / total.
  CHECK(std::pow(10.0, *p.sinad_db / 20.0) ==
        doctest::Approx(std::sqrt(1 - n * n) / n).epsilon(1e-9));
  const double even =
      std::hypot(peak(c, 2), peak(c, 4), std::hypot(peak(c, 6), peak(c, 8), peak(c, 10)));
  const double odd = std::hypot(peak(c, 3), peak(c, 5), std::hypot(peak(c, 7), peak(c, 9)));
  CHECK(*p.even_odd_db == doctest::Approx(20 * std::log10(even / odd)).epsilon(1e-9));
}

TEST_CASE("an inverting unit is seen as such") {
  const TakeSpec spec = spec_for("steady", 997.0, -12.0);
  const Curves c = read(spec, response(spec, [](double x) { return -0.3 * (x + 0.1 * x * x); }));
  CHECK(*c.levels[0].polarity == -1.0);
}

TEST_CASE("calibrated scales turn samples into dBu and volts") {
  RigView rig;
  rig.send = LevelScale::calibrated(to_volts(LevelDbu(24.0)), Decibels(0.0));
  rig.ret = LevelScale::calibrated(to_volts(LevelDbu(18.0)), Decibels(0.0));
  const TakeSpec spec = spec_for("steady", 997.0, -20.0);
  const Curves c = read(spec, response(spec, [](double x) { return 2.0 * x; }), rig);
  // -20 dBFS send = +4 dBu; return -13.98 dBFS = +4.02 dBu.
  CHECK(c.levels[0].drive == doctest::Approx(4.0));
  CHECK(*c.levels[0].output == doctest::Approx(18.0 - 20.0 + 20 * std::log10(2.0)));
  CHECK(*c.levels[0].gain_db == doctest::Approx(20 * std::log10(2.0) - 6.0));
  // 18 dBu full scale: 8.701429842 V peak.
  CHECK(c.harmonics[0].in_phase == doctest::Approx(0.2 * 8.701429842).epsilon(1e-9));
}

TEST_CASE("noise: scatter as the Cramer-Rao bound has it, weak harmonics become upper limits") {
  const double sigma = 1e-4;
  const TakeSpec spec = spec_for("steady", 997.0, -6.0);
  double sum_u = 0.0, sum_squares = 0.0;
  int limits = 0;
  const double amplitude = std::pow(10.0, -6.0 / 20.0);
  const double h2 = 0.05 * amplitude * amplitude / 2.0;
  constexpr int kRuns = 60;
  std::size_t samples = 0;
  for (unsigned run = 0; run < kRuns; ++run) {
    const Waveform take = response(
        spec, [](double x) { return x + 0.05 * x * x; }, sigma, 100 + run);
    const Curves c = read(spec, take);
    sum_squares += std::pow(peak(c, 2) - h2, 2);
    sum_u += c.harmonics[1].component_u;
    limits += c.harmonics[4].flag == Flag::noise;
    const Stimulus s = find_method("steady")->stimulus(spec, Hertz(48000.0));
    samples = s.hold.block * static_cast<std::size_t>(c.levels[0].blocks);
  }
  // Amplitude: var >= 2 sigma^2 / N (Rife & Boorstyn 1974). The scatter of 60 runs is known to
  // 1 / sqrt(120) = 9 %; four of that. The stated u may not leave the bound by more than a tenth.
  const double bound = sigma * std::sqrt(2.0 / static_cast<double>(samples));
  CHECK(std::sqrt(sum_squares / kRuns) == doctest::Approx(bound).epsilon(0.37));
  CHECK(sum_u / kRuns == doctest::Approx(bound).epsilon(0.1));
  // An absent harmonic passes the 95 % threshold in 5 % of runs: 3 of 60, at most 11 at 0.01 %.
  CHECK(limits >= kRuns - 11);
}

TEST_CASE("flags: clipped, beyond the sample rate, unsteady") {
  TakeVerdict verdict;
  const TakeSpec loud = spec_for("steady", 997.0, 0.0);
  Curves c = read(loud, response(loud, [](double x) { return std::clamp(2.0 * x, -1.0, 1.0); }), {},
                  &verdict);
  CHECK(verdict.clipped);
  CHECK(c.levels[0].flag == Flag::clipped);

  const TakeSpec high = spec_for("steady", 4990.0, -12.0);
  c = read(high, response(high, [](double x) { return x; }));
  CHECK(c.harmonics[3].flag != Flag::alias);  // 19.9 kHz
  CHECK(c.harmonics[4].flag == Flag::alias);  // 24.9 kHz
  CHECK_FALSE(c.harmonics[4].level.has_value());
  CHECK(c.levels[0].thd_orders == 4);

  const TakeSpec drifting = spec_for("steady", 997.0, -12.0);
  Waveform take = response(drifting, [](double x) { return x; });
  for (std::size_t n = 0; n < take.samples.size(); ++n) {
    take.samples[n] *= 1.0 + 0.2 * std::exp(-static_cast<double>(n) / 48000.0 / 0.5);
  }
  c = read(drifting, take, {}, &verdict);
  CHECK_FALSE(verdict.settled);
  CHECK(c.levels[0].flag == Flag::unsteady);
}

TEST_CASE("silence and noise in place of a response are flagged, without a crash or a NaN") {
  const TakeSpec spec = spec_for("steady", 997.0, -12.0);
  for (const double sigma : {0.0, 1e-5}) {
    const Curves c = read(spec, response(
                                    spec, [](double) { return 0.0; }, sigma));
    CHECK(c.levels.at(0).flag == Flag::noise);
    CHECK_FALSE(c.levels[0].thd_f_percent.has_value());
  }
}

TEST_CASE("a perfect wire gives no infinite or undefined figure") {
  const TakeSpec spec = spec_for("steady", 997.0, -12.0);
  for (const bool rounded : {false, true}) {
    const Curves c = read(spec, response(spec, [&](double x) {
                            return rounded ? static_cast<double>(static_cast<float>(x)) : x;
                          }));
    const LevelPoint& p = c.levels.at(0);
    for (const Cell& cell : {p.output, p.gain_db, p.thd_f_percent, p.thdn_percent, p.noise,
                             p.sinad_db, p.even_odd_db, p.thd_f_u_percent, p.thdn_u_percent}) {
      if (cell) CHECK(std::isfinite(*cell));
    }
    for (const HarmonicPoint& h : c.harmonics) {
      for (const Cell& cell : {h.level, h.relative_db, h.expanded_u_db, h.relative_high_db}) {
        if (cell) CHECK(std::isfinite(*cell));
      }
    }
    // Double arithmetic: far under -250 dB; stored as float32: under -140 dB.
    if (p.thd_f_percent) CHECK(*p.thd_f_percent < (rounded ? 1e-5 : 1e-10));
  }
}

TEST_CASE("a take tells by how much longer it must be for the wanted uncertainty") {
  const auto curve = [](double x) { return x + 0.01 * x * x + 0.02 * x * x * x; };
  TakeSpec spec = spec_for("steady", 997.0, -20.0);
  spec.settings.wanted_harmonic_u = Decibels(1.0);
  spec.settings.wanted_orders = 3;
  TakeVerdict verdict;
  Curves c = read(spec, response(spec, curve, 3e-4), {}, &verdict);
  REQUIRE(verdict.longer.has_value());
  CHECK(*verdict.longer > 1.5);
  CHECK(c.levels.at(0).integration == "time-spent");
  // Expanded uncertainty falls with the square root of the time; its own estimate scatters by some
  // per cent.
  spec.hold_blocks = static_cast<int>(std::ceil(1.3 * *verdict.longer * spec.hold_blocks));
  c = read(spec, response(spec, curve, 3e-4, 2), {}, &verdict);
  CHECK(*verdict.longer <= 1.0);
  CHECK(c.levels.at(0).integration == "reached");
  CHECK(*c.harmonics.at(1).expanded_u_db <= 1.0);
  CHECK(*c.harmonics.at(2).expanded_u_db <= 1.0);

  // A rig floor 10 dB under H3 is 2.7 dB of doubt that no time takes away.
  RigView rig;
  const Decibels under(*c.harmonics.at(2).relative_db - 16.0);  // counted for send and for return
  rig.floor = RigFloor({{LevelDbfs(0.0), 2, Decibels(-140.0)}, {LevelDbfs(0.0), 3, under}});
  c = read(spec, response(spec, curve, 3e-4, 2), rig, &verdict);
  CHECK(c.levels.at(0).integration == "floor");
}

TEST_CASE("the rig's own response is taken out, and an unknown split is a stated term") {
  // Send and return each as a first-order low-pass; the device between them is a cubic.
  const auto send = [](double f) { return 1.0 / std::complex<double>(1.0, f / 30000.0); };
  const auto ret = [](double f) { return 1.0 / std::complex<double>(1.0, f / 20000.0); };
  const auto db = [](std::complex<double> z) { return 20.0 * std::log10(std::abs(z)); };
  const TakeSpec spec = spec_for("steady", 4990.0, -12.0);
  const Hertz f = steady_frequency(spec, Hertz(48000.0));
  const std::vector<double> w{0.0, 1.0, 0.2, 0.1};  // polynomial
  const std::complex<double> drive = sine_peak(spec.send) * send(f.value());
  const double a = std::abs(drive);
  // Cosine drive of peak a: H1 = a + 3/4 w3 a^3, H2 = w2 a^2 / 2, H3 = w3 a^3 / 4, each at n times
  // the drive's phase, then through the return.
  const std::array<double, 4> h{0.0, a + 0.75 * w[3] * a * a * a, w[2] * a * a / 2.0,
                                w[3] * a * a * a / 4.0};
  Waveform take = find_method("steady")->stimulus(spec, Hertz(48000.0)).wave;
  const HoldLayout hold = find_method("steady")->stimulus(spec, Hertz(48000.0)).hold;
  for (std::size_t i = 0; i < take.samples.size(); ++i) {
    const double angle = 2.0 * std::numbers::pi * f.value() *
                         (static_cast<double>(i) - static_cast<double>(hold.first_block)) / 48000.0;
    take.samples[i] = 0.0;
    for (int n = 1; n <= 3; ++n) {
      const std::complex<double> r = ret(n * f.value());
      take.samples[i] += h[static_cast<std::size_t>(n)] * std::abs(r) *
                         std::cos(n * (angle + std::arg(drive)) + std::arg(r));
    }
  }
  std::vector<LoopPoint> loop;
  for (int n = 1; n <= 3; ++n) {
    const std::complex<double> p = send(n * f.value()) * ret(n * f.value());
    loop.push_back({n * f, Decibels(db(p)), std::arg(p) * 180.0 / std::numbers::pi});
  }
  RigView rig;
  rig.response = LoopResponse(loop);
  const Curves c = read(spec, take, rig);
  // Gain and transfer phase need no split.
  CHECK(*c.levels.at(0).gain_db == doctest::Approx(20.0 * std::log10(h[1] / a)).epsilon(1e-9));
  CHECK(*c.responses.at(0).phase_deg == doctest::Approx(0.0).scale(1.0).epsilon(1e-9));
  CHECK(*c.levels[0].gain_u_db < 1e-9);
  // The even split is wrong here; the truth lies within its term, and the term is not idle.
  for (int n = 2; n <= 3; ++n) {
    const HarmonicPoint& p = c.harmonics.at(static_cast<std::size_t>(n - 1));
    const double truth = 20.0 * std::log10(h[static_cast<std::size_t>(n)] / h[1]);
    CHECK(std::abs(*p.relative_db - truth) <= *p.expanded_u_db);
    const double split = std::abs(loop[static_cast<std::size_t>(n - 1)].magnitude.value() -
                                  loop[0].magnitude.value()) /
                         2.0 / std::sqrt(3.0);
    CHECK(*p.expanded_u_db == doctest::Approx(1.959964 * split).epsilon(1e-3));
    CHECK(c.levels[0].output_u_db.value() > 0.1);
  }
  // With all of it in the return, and a device that says so, nothing is left to doubt.
  rig.response = LoopResponse(
      {{f, Decibels(db(ret(f.value()))), std::arg(ret(f.value())) * 180.0 / std::numbers::pi},
       {2.0 * f, Decibels(db(ret(2.0 * f.value()))),
        std::arg(ret(2.0 * f.value())) * 180.0 / std::numbers::pi},
       {3.0 * f, Decibels(db(ret(3.0 * f.value()))),
        std::arg(ret(3.0 * f.value())) * 180.0 / std::numbers::pi}},
      1.0);
  const Curves exact = read(spec, take, rig);
  for (int n = 2; n <= 3; ++n) {
    const HarmonicPoint& p = exact.harmonics.at(static_cast<std::size_t>(n - 1));
    CHECK(*p.relative_db ==
          doctest::Approx(20.0 * std::log10(h[static_cast<std::size_t>(n)] / h[1])).epsilon(1e-9));
    CHECK(*p.phase_deg == doctest::Approx(0.0).scale(1.0).epsilon(1e-7));
  }
}

TEST_CASE("a take on the way down says so, and leaves the response table to the way up") {
  TakeSpec spec = spec_for("steady", 997.0, -20.0);
  const Waveform take = response(
      spec, [](double x) { return x + 0.1 * x * x; }, 1e-6, 1);
  const Curves up = read(spec, take);
  spec.down = true;
  const Curves down = read(spec, take);
  CHECK(up.levels.at(0).direction == "up");
  CHECK(down.levels.at(0).direction == "down");
  for (const auto& h : down.harmonics) CHECK(h.direction == "down");
  CHECK(down.harmonics.size() == up.harmonics.size());
  CHECK(!up.responses.empty());
  CHECK(down.responses.empty());
}

TEST_CASE("the noise of a level stands apart from calibration and floor") {
  const TakeSpec spec = spec_for("steady", 997.0, -20.0);
  const Waveform take = response(
      spec, [](double x) { return x + 0.1 * x * x; }, 1e-6, 1);
  RigView rig;
  rig.ret = rig.send = LevelScale::calibrated(VoltsRms(1.0), Decibels(0.3));
  const Curves bare = read(spec, take), doubted = read(spec, take, rig);
  for (const int n : {1, 2}) {
    const HarmonicPoint &a = bare.harmonics.at(static_cast<std::size_t>(n - 1)),
                        &b = doubted.harmonics.at(static_cast<std::size_t>(n - 1));
    CHECK(a.noise_u_db > 0.0);
    CHECK(a.noise_u_db == b.noise_u_db);
    CHECK(*b.level_u_db > 0.5);
  }
}
