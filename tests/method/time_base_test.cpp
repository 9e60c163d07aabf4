// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/time_base.h"

#include <doctest/doctest.h>

#include <array>
#include <boost/math/special_functions/bessel.hpp>
#include <cmath>
#include <limits>
#include <numbers>
#include <random>
#include <vector>

#include "method/hold.h"
#include "method/synthetic.h"

using namespace kneeprint;
using kneeprint::testing::read;
using kneeprint::testing::spec_for;

namespace {

constexpr Hertz kRate{48000.0};
constexpr double kTurn = 2.0 * std::numbers::pi;

struct Wow {
  double rate_hz = 1.0, peak = 0.0, phase = 0.0;
};

// The stimulus' time, in s, that plays at the time t of the recording: closed form.
struct Recorder {
  double speed = 0.0;
  std::vector<Wow> wows;
  double middle_s = 0.0;  // where nothing has gathered yet but the wows' own excursion

  double at(double t) const {
    double u = t + speed * (t - middle_s);
    for (const Wow& w : wows) {
      const double turn = kTurn * w.rate_hz;
      u += w.peak / turn * std::sin(turn * (t - middle_s) + w.phase);
    }
    return u;
  }
};

struct Partial {
  double frequency_hz = 0.0, peak = 0.0, phase = 0.0;
  double until_s = std::numeric_limits<double>::infinity();
};

// Tones in the recorder's time, with cosine phases from the first block on, gated like the
// stimulus but without its ramps, which no reading sees.
Waveform record(const Stimulus& stimulus, const std::vector<Partial>& tones, Recorder recorder,
                double noise = 0.0, unsigned seed = 1) {
  const double origin = static_cast<double>(stimulus.hold.first_block) / kRate.value();
  const double end = stimulus.wave.duration().value() - kHoldMargin.value();
  recorder.middle_s = 0.5 * (origin + static_cast<double>(stimulus.hold.end()) / kRate.value());
  Waveform out{kRate, std::vector<double>(stimulus.wave.samples.size(), 0.0)};
  std::mt19937_64 random(seed);
  std::normal_distribution<double> normal(0.0, 1.0);
  for (std::size_t n = 0; n < out.samples.size(); ++n) {
    const double u = recorder.at(static_cast<double>(n) / kRate.value());
    if (u > kHoldMargin.value() && u < end) {
      for (const Partial& t : tones) {
        if (u < t.until_s) {
          out.samples[n] += t.peak * std::cos(kTurn * t.frequency_hz * (u - origin) + t.phase);
        }
      }
    }
    if (noise > 0.0) out.samples[n] += noise * normal(random);
  }
  return out;
}

Stimulus stimulus_of(const TakeSpec& spec) {
  return find_method(spec.method)->stimulus(spec, kRate);
}

std::size_t cycles_of(double f, const Stimulus& s) {
  return static_cast<std::size_t>(
      std::llround(f * static_cast<double>(s.hold.block) / kRate.value()));
}

constexpr std::array kPeaks{0.7, 0.07, -0.02, 0.005, 0.002};

std::vector<Partial> harmonics(double f) {
  std::vector<Partial> tones;
  for (std::size_t k = 0; k < kPeaks.size(); ++k) {
    const double order = static_cast<double>(k + 1);
    if (order * f < 0.45 * kRate.value()) tones.push_back({order * f, kPeaks[k]});
  }
  return tones;
}

const RigView kReel = [] {
  RigView rig;
  rig.drifting_clock = true;
  return rig;
}();

double decibels(double ratio) { return 20.0 * std::log10(std::abs(ratio)); }

const IntermodPoint& row(const Curves& c, const std::string& product) {
  for (const IntermodPoint& p : c.intermods) {
    if (p.product == product) return p;
  }
  throw std::out_of_range(product);
}

}  // namespace

TEST_CASE("harmonics through 0.3 % of speed and 0.2 % of flutter, 0.5 to 10 Hz, to 0.001 dB") {
  for (const double asked : {41.0, 997.0, 4990.0}) {
    const TakeSpec spec = spec_for("steady", asked, -3.0);
    const Stimulus s = stimulus_of(spec);
    const double f = s.lowest_tone.value();
    for (const double rate_hz : {0.5, 2.0, 5.0, 10.0}) {
      CAPTURE(asked);
      CAPTURE(rate_hz);
      const Recorder recorder{rate_hz < 3.0 ? 0.003 : -0.0005, {{rate_hz, 0.002, 0.3}}};
      const Curves c = read(spec, record(s, harmonics(f), recorder), kReel);
      const auto tones = harmonics(f);
      for (std::size_t k = 0; k < tones.size(); ++k) {
        const HarmonicPoint& h = c.harmonics.at(k);
        CAPTURE(h.order);
        const double error =
            std::abs(decibels(std::hypot(h.in_phase, h.quadrature) / tones[k].peak));
        CHECK(error < 0.001);
        // What the spline leaves is stated; the interpolator's ripple of -140 dB apart.
        CHECK(error < *h.level_u_db + 1e-6);
        CHECK(*h.level_u_db < 0.003);
        // Phases come back as well: 0, or 180 for the negative one.
        CHECK(std::abs(std::sin(*h.phase_deg * std::numbers::pi / 180.0)) < 2e-3);
      }
    }
  }
}

TEST_CASE("speed and flutter themselves are read") {
  for (const double rate_hz : {1.0, 2.0, 5.0, 10.0}) {
    CAPTURE(rate_hz);
    const TakeSpec spec = spec_for("steady", 997.0, -3.0);
    const Stimulus s = stimulus_of(spec);
    const Recorder recorder{0.0004, {{rate_hz, 0.001, 0.0}}};
    const Waveform take = record(s, harmonics(s.lowest_tone.value()), recorder);
    const RecorderTime time =
        steady_time(take, s.hold, std::array{cycles_of(s.lowest_tone.value(), s)}).time;
    CHECK(time.drifts);
    // A peak between whole cycles of the record, whose mean is taken off, is some per cent off.
    CHECK(time.flutter == doctest::Approx(0.001).epsilon(0.1));
    // Excursions of +-0.001 / (2 pi rate) at both ends of 2.5 s.
    CHECK(std::abs(time.speed - 0.0004) < 2.0 * 0.001 / (kTurn * rate_hz) / 2.5);
  }
}

TEST_CASE("smpte products through speed error and flutter: amplitudes, AM and PM parts") {
  const TakeSpec spec = spec_for("smpte", 0.0, -3.0);
  const Stimulus s = stimulus_of(spec);
  const double until = static_cast<double>(s.hold.end()) / kRate.value() + kHoldMargin.value();
  // Second order as amplitude modulation, third as phase modulation (sidebands in quadrature).
  const double quarter = 0.25 * kTurn;
  const std::vector<Partial> tones{
      {60.0, 0.5, 0.0, until},          {7000.0, 0.125, 0.0},
      {7060.0, 0.002, 0.0, until},      {6940.0, 0.002, 0.0, until},
      {7120.0, 0.0005, quarter, until}, {6880.0, 0.0005, quarter, until}};
  for (const double rate_hz : {0.5, 2.0, 5.0, 10.0}) {
    CAPTURE(rate_hz);
    const Recorder recorder{0.001, {{rate_hz, 0.001, 1.0}, {0.7, 0.001, 2.0}}};
    const Curves c = read(spec, record(s, tones, recorder), kReel);
    const IntermodPoint &m2 = row(c, "m2"), &m3 = row(c, "m3");
    CHECK(m2.flag == Flag::none);
    CHECK(m3.flag == Flag::none);
    CHECK(std::abs(decibels(*m2.percent / 3.2)) < 0.001);
    CHECK(std::abs(decibels(*m3.percent / 0.8)) < 0.001);
    CHECK(std::abs(*m2.am_percent - 3.2) < 1e-3);
    CHECK(*m2.pm_percent < 1e-3);
    CHECK(std::abs(*m3.pm_percent - 0.8) < 1e-3);
    CHECK(*m3.am_percent < 1e-3);
    CHECK(*m2.expanded_u_db < 0.01);
  }
}

TEST_CASE("flutter that turns whole cycles in a block is no product of two tones") {
  // 62 and 7004 Hz in blocks of 0.5 s share one bin: every bin is some product of theirs.
  const TakeSpec spec = spec_for("smpte", 0.0, -3.0);
  Stimulus s = stimulus_of(spec);
  s.hold.block = 24000;
  s.hold.blocks = 4;
  const std::array tones{cycles_of(62.0, s), cycles_of(7004.0, s)};
  const double until = static_cast<double>(s.hold.end()) / kRate.value() + kHoldMargin.value();
  for (const double rate_hz : {2.0, 4.0, 10.0}) {
    CAPTURE(rate_hz);
    const Recorder recorder{0.0, {{rate_hz, 0.001, 0.5}}};
    const Waveform take = record(s, {{62.0, 0.5, 0.0, until}, {7004.0, 0.125}}, recorder);
    const SteadiedTake steadied = steady_time(take, s.hold, tones);
    CHECK(steadied.time.flutter == doctest::Approx(0.001).epsilon(0.1));
    const BlockSpectra spectra(steadied.or_else(take), s.hold, 1);
    for (int b = 0; b < spectra.blocks(); ++b) {
      CHECK(std::abs(decibels(std::abs(spectra.at(b, tones[1])) / 0.125)) < 0.001);
      CHECK(std::abs(decibels(std::abs(spectra.at(b, tones[0])) / 0.5)) < 0.001);
    }
  }
}

TEST_CASE("ccif products through speed error and flutter") {
  const TakeSpec spec = spec_for("ccif", 0.0, -3.0);
  const Stimulus s = stimulus_of(spec);
  const std::vector<Partial> tones{
      {19000.0, 0.35}, {20000.0, 0.35}, {1000.0, 0.007}, {18000.0, 0.0014}, {21000.0, 0.0014}};
  for (const double rate_hz : {0.5, 2.0, 5.0, 10.0}) {
    CAPTURE(rate_hz);
    const Recorder recorder{0.001, {{rate_hz, 0.001, 1.0}, {0.7, 0.001, 2.0}}};
    const Curves c = read(spec, record(s, tones, recorder), kReel);
    CHECK(std::abs(decibels(*row(c, "d2").percent / 1.0)) < 0.001);
    CHECK(std::abs(decibels(*row(c, "d3").percent / 0.4)) < 0.001);
    CHECK(*row(c, "d3").expanded_u_db < 0.01);
  }
}

TEST_CASE("a take without drift is left bit for bit, in noise as well") {
  const TakeSpec spec = spec_for("steady", 997.0, -3.0);
  const Stimulus s = stimulus_of(spec);
  const std::array tones{cycles_of(s.lowest_tone.value(), s)};
  Waveform wire = s.wave;
  for (double& x : wire.samples) x = static_cast<double>(static_cast<float>(x));
  const SteadiedTake clean = steady_time(wire, s.hold, tones);
  CHECK_FALSE(clean.take.has_value());
  CHECK_FALSE(clean.time.drifts);
  CHECK(clean.emptied == 0);
  CHECK(&clean.or_else(wire) == &wire);
  // float32 in 1/50 s of a tone: rounding of 2^-25 / sqrt(3) per sample tells time to 1e-13 s.
  CHECK(clean.time.jitter.value() < 1e-11);
  // Stored as float32 and read as a reel: THD_F under -170 dB.
  const Curves c = read(spec, wire, kReel);
  if (c.levels.at(0).thd_f_percent) CHECK(decibels(*c.levels[0].thd_f_percent / 100.0) < -170.0);

  // At 0.1 % of false alarms two or more of 40 takes come up once in 1300.
  int moved = 0;
  for (unsigned seed = 1; seed <= 40; ++seed) {
    TakeSpec brief = spec;
    brief.settings.block = Seconds(0.2);
    brief.hold_blocks = 3;
    const Stimulus b = stimulus_of(brief);
    const double f = b.lowest_tone.value();
    const double noise = 0.7 * std::pow(10.0, -static_cast<double>(seed) / 20.0);
    const Waveform take = record(b, harmonics(f), {}, noise, seed);
    moved += steady_time(take, b.hold, std::array{cycles_of(f, b)}).take.has_value();
  }
  CHECK(moved <= 1);
}

TEST_CASE("hum by a low tone is not taken for flutter, and flutter of that rate still is") {
  const TakeSpec spec = spec_for("steady", 41.0, -3.0);
  const Stimulus s = stimulus_of(spec);
  const double f = s.lowest_tone.value();
  std::vector<Partial> tones = harmonics(f);
  // 40 dB under the tone: followed, it would turn the tone by 0.01 rad and take 0.005 dB of H5.
  tones.push_back({50.0, 0.007, 1.0});
  tones.push_back({60.0, 0.003, 2.0});
  const Curves clean = read(spec, record(s, tones, {}, 1e-5), kReel);
  for (std::size_t k = 0; k < kPeaks.size(); ++k) {
    const HarmonicPoint& h = clean.harmonics.at(k);
    CAPTURE(h.order);
    CHECK(std::abs(decibels(std::hypot(h.in_phase, h.quadrature) / kPeaks[k])) < *h.level_u_db);
    CHECK(*h.level_u_db < 0.01);
  }
  // Flutter of just that rate has a sideband on 50 Hz.
  const double beat = 50.0 - f;
  const Recorder recorder{0.0, {{beat, 0.001, 0.0}}};
  const SteadiedTake steadied =
      steady_time(record(s, harmonics(f), recorder), s.hold, std::array{cycles_of(f, s)});
  CHECK(steadied.time.flutter == doctest::Approx(0.001).epsilon(0.1));
  const Curves c = read(spec, record(s, harmonics(f), recorder), kReel);
  for (std::size_t k = 0; k < kPeaks.size(); ++k) {
    const HarmonicPoint& h = c.harmonics.at(k);
    CHECK(std::abs(decibels(std::hypot(h.in_phase, h.quadrature) / kPeaks[k])) < 0.001);
  }
}

TEST_CASE("nothing to follow: silence, noise, no tone, a time that runs away") {
  const TakeSpec spec = spec_for("steady", 997.0, -3.0);
  const Stimulus s = stimulus_of(spec);
  const double f = s.lowest_tone.value();
  const std::array tones{cycles_of(f, s)};
  const Waveform silence{kRate, std::vector<double>(s.wave.samples.size(), 0.0)};
  CHECK_FALSE(steady_time(silence, s.hold, tones).take.has_value());
  CHECK_FALSE(steady_time(s.wave, s.hold, {}).take.has_value());
  CHECK_FALSE(steady_time(record(s, {}, {}, 0.1), s.hold, tones).take.has_value());
  // 2 % off gathers 25 ms on either side of the middle: the hold's ends are not there.
  const SteadiedTake away = steady_time(record(s, harmonics(f), {0.02, {}}), s.hold, tones);
  CHECK_FALSE(away.take.has_value());
  CHECK(away.time.loss(Hertz(f)) > 0.9);
}

TEST_CASE("jitter beyond the tracker's band is stated: the carrier's loss is 1 - J0") {
  const TakeSpec spec = spec_for("steady", 997.0, -3.0);
  const Stimulus s = stimulus_of(spec);
  const double f = s.lowest_tone.value();
  const double rate_hz = 80.0, peak = 0.002;
  const Recorder recorder{0.0, {{rate_hz, peak, 0.0}, {3.0, 0.001, 0.0}}};
  const Waveform take = record(s, harmonics(f), recorder);
  const SteadiedTake steadied = steady_time(take, s.hold, std::array{cycles_of(f, s)});
  const double excursion = peak / (kTurn * rate_hz);
  CHECK(steadied.time.drifts);
  CHECK(steadied.time.jitter.value() == doctest::Approx(excursion / std::sqrt(2.0)).epsilon(0.02));
  const Curves c = read(spec, take, kReel);
  for (int k = 1; k <= 5; ++k) {
    CAPTURE(k);
    const HarmonicPoint& h = c.harmonics.at(static_cast<std::size_t>(k - 1));
    const double left = boost::math::cyl_bessel_j(0, kTurn * k * f * excursion);
    const double found =
        std::hypot(h.in_phase, h.quadrature) / std::abs(kPeaks[static_cast<std::size_t>(k - 1)]);
    CHECK(found == doctest::Approx(left).epsilon(1e-4));
    // Twice the 2 % to which the jitter is told.
    CHECK(h.component_u >= 0.96 * (1.0 - left) * std::hypot(h.in_phase, h.quadrature));
    CHECK(-decibels(found) < *h.level_u_db);
  }
}

TEST_CASE("the loss is that of a Gaussian phase; the noise of the tracker stands in the jitter") {
  RecorderTime time;
  CHECK(time.loss(Hertz(20000.0)) == 0.0);
  time.jitter = Seconds(1e-6);
  // x = 2 pi 0.02: 1 - exp(-x^2 / 2).
  CHECK(time.loss(Hertz(20000.0)) == doctest::Approx(0.0078645).epsilon(1e-4));

  // Cramer-Rao for a spline of K coefficients in N samples: K sigma^2 / (N (A w)^2 / 2).
  const TakeSpec spec = spec_for("steady", 997.0, -3.0);
  const Stimulus s = stimulus_of(spec);
  const double f = s.lowest_tone.value(), noise = 0.01;
  const Recorder recorder{0.0, {{1.0, 0.001, 0.0}}};
  const Waveform take = record(s, {{f, 0.7}}, recorder, noise);
  const SteadiedTake steadied = steady_time(take, s.hold, std::array{cycles_of(f, s)});
  const double samples = static_cast<double>(s.hold.end() - s.hold.first_block) + 480.0;
  const double coefficients = samples / 768.0 + 5.0;
  const double expected = std::sqrt(2.0 * coefficients / samples) * noise / (0.7 * kTurn * f);
  // The sidebands' own scatter around nothing adds to it, never takes away.
  CHECK(steadied.time.jitter.value() > 0.9 * expected);
  CHECK(steadied.time.jitter.value() < 2.0 * expected);
}

TEST_CASE("the tones of a stimulus: one, two, or none that are steady") {
  const Stimulus one = stimulus_of(spec_for("steady", 997.0, -3.0));
  REQUIRE(steady_tones(one).size() == 1);
  CHECK(steady_tones(one)[0] == cycles_of(one.lowest_tone.value(), one));
  const Stimulus two = stimulus_of(spec_for("smpte", 0.0, -3.0));
  CHECK(steady_tones(two) == std::vector{cycles_of(60.0, two), cycles_of(7000.0, two)});
  Stimulus noise = one;
  std::mt19937 random(1);
  std::normal_distribution<double> normal(0.0, 0.1);
  for (double& x : noise.wave.samples) x = normal(random);
  CHECK(steady_tones(noise).empty());
  Stimulus once = one;
  once.hold.blocks = 1;
  CHECK(steady_tones(once).empty());
}
