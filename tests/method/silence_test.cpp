// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/silence.h"

#include <doctest/doctest.h>

#include <cmath>
#include <complex>
#include <functional>
#include <numbers>
#include <random>
#include <string>
#include <vector>

#include "method/coherent.h"
#include "method/synthetic.h"
#include "signal/weighting.h"

using namespace kneeprint;
using kneeprint::testing::read;
using kneeprint::testing::spec_for;

namespace {

const Hertz kRate(48000.0);
constexpr double kTurn = 2.0 * std::numbers::pi;

TakeSpec silence_spec(double seconds = 2.0) {
  TakeSpec spec = spec_for("silence", 0.0, -60.0);
  spec.options.duration = Seconds(seconds);
  spec.hold_blocks = find_method("silence")->first_hold_blocks(spec, kRate);
  return spec;
}

Waveform with_noise(Waveform w, double sigma, unsigned seed) {
  std::mt19937_64 random(seed);
  std::normal_distribution<double> noise(0.0, sigma);
  for (double& x : w.samples) x += noise(random);
  return w;
}

Waveform sent(const TakeSpec& spec) { return find_method("silence")->stimulus(spec, kRate).wave; }

std::vector<ScalarPoint> rows(const Curves& c, const std::string& figure,
                              const std::string& state) {
  std::vector<ScalarPoint> some;
  for (const ScalarPoint& p : c.scalars) {
    if (p.figure == figure && p.state == state) some.push_back(p);
  }
  return some;
}

ScalarPoint row(const Curves& c, const std::string& figure, const std::string& state) {
  const auto some = rows(c, figure, state);
  REQUIRE(some.size() == 1);
  return some[0];
}

const std::string kStates[] = {"drive-free", "idle-with-bias"};

// Level (full-scale sine = 0 dB) of white noise of that sigma, weighted, 20 Hz to 20 kHz: midpoint
// rule over the response's square.
double white_level(double sigma, Weighting weighting) {
  double integral = 0.0;
  for (double f = 20.5; f < 20000.0; f += 1.0) integral += std::norm(weighting(Hertz(f)));
  return 10.0 * std::log10(2.0 * sigma * sigma * integral / (kRate.value() / 2.0));
}

}  // namespace

TEST_CASE("silence plays digital zero, then the low tone, each for the time asked") {
  const TakeSpec spec = silence_spec(3.2);
  const Method& m = *find_method("silence");
  const Stimulus s = m.stimulus(spec, kRate);
  const double block = m.block_length(spec, kRate).value();
  CHECK(spec.hold_blocks * block >= 3.2);
  CHECK((spec.hold_blocks - 1) * block < 3.2);
  CHECK(find_method("silence")->first_hold_blocks(silence_spec(0.1), kRate) * block >= 2.0);
  // Longest time constant 0.5 s: 1.5 s before each state, one block after it.
  std::size_t zeros = 0;
  while (s.wave.samples[zeros] == 0.0) ++zeros;
  CHECK(static_cast<double>(zeros) / kRate.value() >= 1.5 + 3.2 + block);
  CHECK(s.hold.first_block > zeros);
  CHECK(s.hold.blocks >= spec.hold_blocks + 4);
  double peak = 0.0;
  for (std::size_t n = s.hold.first_block; n < s.hold.end(); ++n) {
    peak = std::max(peak, std::abs(s.wave.samples[n]));
  }
  CHECK(peak == doctest::Approx(1e-3).epsilon(1e-6));  // -60 dBFS, the lowest rung
}

TEST_CASE("white noise through a wire: three figures, two states, the tone taken out") {
  const double sigma = 3e-5;
  const TakeSpec spec = silence_spec();
  RigView rig;
  rig.ret = rig.send = LevelScale::calibrated(to_volts(LevelDbu(18.0)), Decibels(0.1));
  const Curves c = read(spec, with_noise(sent(spec), sigma, 5), rig);
  for (const std::string& state : kStates) {
    CAPTURE(state);
    const ScalarPoint flat = row(c, "noise", state), a = row(c, "noise-a", state),
                      qp = row(c, "noise-468", state);
    CHECK(flat.value_unit == "dBu");
    // Relative standard deviation of the power sqrt(1 / (B T)): 0.5 % or 0.02 dB flat, 0.03 dB with
    // A's 13 kHz of noise bandwidth; five of them.
    CHECK(std::abs(*flat.value - (white_level(sigma, flat_weighting) + 18.0)) < 0.11);
    CHECK(std::abs(*a.value - (white_level(sigma, a_weighting) + 18.0)) < 0.15);
    // The quasi-peak of Gaussian noise stands 4.1 dB above its rms with these time constants
    // (separate simulation of 200 s); pointer's own deviation 1.3 %, 0.05 dB over 2 s.
    CHECK(std::abs(*qp.value - (white_level(sigma, itu468_weighting) + 18.0 + 4.10)) < 0.25);
    for (const ScalarPoint& p : {flat, a, qp}) {
      CHECK(p.flag == Flag::none);
      // Nearly all of it the scale's: 1.96 * 0.1 dB; type A adds in quadrature.
      CHECK(*p.expanded_u > 0.196);
      CHECK(*p.expanded_u < 0.25);
    }
    CHECK(rows(c, "hum", state).empty());
    CHECK(row(c, "hum-total", state).flag == Flag::noise);
    CHECK(*row(c, "hum-total", state).value < *flat.value);
    CHECK(rows(c, "mains-frequency", state).empty());
  }
  CHECK(!row(c, "noise", "drive-free").drive);
  CHECK(*row(c, "noise", "idle-with-bias").drive == doctest::Approx(-42.0));
}

TEST_CASE("a whistle reads its weighted level on every meter") {
  const TakeSpec spec = silence_spec();
  for (const double f : {1013.0, 6307.0}) {
    CAPTURE(f);
    Waveform w = sent(spec);
    for (std::size_t n = 0; n < w.samples.size(); ++n) {
      w.samples[n] += 1e-4 * std::sin(kTurn * f * static_cast<double>(n) / kRate.value());
    }
    const Curves c = read(spec, with_noise(w, 1e-8, 3));
    const auto db = [&](Weighting h) { return -80.0 + 20.0 * std::log10(std::abs(h(Hertz(f)))); };
    // 0.001 dB: two beats of the whistle with each block's ends; 0.02 dB: crests between samples.
    CHECK(std::abs(*row(c, "noise", "drive-free").value - db(flat_weighting)) < 1e-3);
    CHECK(std::abs(*row(c, "noise-a", "drive-free").value - db(a_weighting)) < 1e-3);
    CHECK(std::abs(*row(c, "noise-468", "drive-free").value - db(itu468_weighting)) < 0.02);
  }
}

TEST_CASE("hum of a wandering mains is found with its frequency and levels") {
  const TakeSpec spec = silence_spec(5.0);
  struct Line {
    int multiple;
    double peak;
  };
  for (const double base : {50.03, 59.96}) {
    CAPTURE(base);
    const Line lines[] = {{1, 1e-4}, {2, 2e-5}, {3, 6e-5}, {7, 1e-5}, {13, 8e-6}};
    Waveform w = sent(spec);
    for (std::size_t n = 0; n < w.samples.size(); ++n) {
      const double t = static_cast<double>(n) / kRate.value();
      // Frequency base + 0.05 cos(2 pi t / 9 s): its phase by integration.
      const double phase = kTurn * base * t + 0.05 * 9.0 * std::sin(kTurn * t / 9.0);
      for (const Line& l : lines)
        w.samples[n] += l.peak * std::cos(l.multiple * phase + l.multiple);
    }
    const Curves c = read(spec, with_noise(w, 3e-5, 11));
    for (const std::string& state : kStates) {
      CAPTURE(state);
      const ScalarPoint mains = row(c, "mains-frequency", state);
      CHECK(std::abs(*mains.value - base) < 0.05);  // the mean over the state, within the wander
      CHECK(*mains.expanded_u < 0.05);
      const auto found = rows(c, "hum", state);
      REQUIRE(found.size() == std::size(lines));
      double total = 0.0;
      for (std::size_t i = 0; i < found.size(); ++i) {
        CAPTURE(lines[i].multiple);
        CHECK(*found[i].frequency_hz == doctest::Approx(lines[i].multiple * *mains.value));
        // Twice the 95 % interval: 1 of 10^4 for each of 20 figures.
        CHECK(std::abs(*found[i].value - 20.0 * std::log10(lines[i].peak)) <
              2.0 * *found[i].expanded_u + 0.01);
        total += lines[i].peak * lines[i].peak;
      }
      CHECK(std::abs(*row(c, "hum-total", state).value - 10.0 * std::log10(total)) <
            2.0 * *row(c, "hum-total", state).expanded_u + 0.01);
    }
  }
}

TEST_CASE("a gate rests without drive: only the idle state shows the noise") {
  const TakeSpec spec = silence_spec();
  const std::size_t tone_begins = find_method("silence")->stimulus(spec, kRate).hold.first_block;
  Waveform w = with_noise(sent(spec), 1e-5, 4);
  for (std::size_t n = 0; n < tone_begins; ++n) w.samples[n] = 0.0;
  const Curves c = read(spec, w);
  CHECK(!row(c, "noise", "drive-free").value);
  CHECK(row(c, "noise", "drive-free").flag == Flag::noise);
  CHECK(!row(c, "noise-468", "drive-free").value);
  CHECK(!row(c, "hum-total", "drive-free").value);
  CHECK(std::abs(*row(c, "noise", "idle-with-bias").value - white_level(1e-5, flat_weighting)) <
        0.11);
}

TEST_CASE("a wire without noise has none to state, only a flag") {
  const TakeSpec spec = silence_spec();
  const Curves c = read(spec, sent(spec));
  CHECK(c.scalars.size() == 8);
  for (const ScalarPoint& p : c.scalars) {
    CHECK(!p.value);
    CHECK(p.flag == Flag::noise);
  }
}

TEST_CASE(
    "the low tone's harmonics and its settling are no noise; its flutter is, and is flagged") {
  const TakeSpec spec = silence_spec();
  const double quiet = white_level(1e-6, flat_weighting);
  const std::size_t begin = find_method("silence")->stimulus(spec, kRate).hold.first_block;
  const auto bent = [&](const std::function<double(double)>& gain, double flutter) {
    Waveform w = sent(spec);
    const CoherentTone tone = coherent_tone(Hertz(997.0), kRate, Seconds(0.5), 10);
    for (std::size_t n = begin; n < w.samples.size(); ++n) {
      const double t = static_cast<double>(n - begin) / kRate.value();
      const double angle = kTurn * tone.frequency.value() * t + flutter * std::sin(kTurn * 4.0 * t);
      const double x = gain(t) * 1e-3 * std::cos(angle);
      w.samples[n] = x + 100.0 * x * x - 2e4 * x * x * x;
    }
    return read(spec, with_noise(w, 1e-6, 6));
  };
  const Curves steady = bent([](double) { return 1.0; }, 0.0);
  CHECK(std::abs(*row(steady, "noise", "idle-with-bias").value - quiet) < 0.11);
  // 1 dB of gain still decaying with 2 s.
  const Curves settling = bent([](double t) { return 1.0 + 0.12 * std::exp(-t / 2.0); }, 0.0);
  CHECK(std::abs(*row(settling, "noise", "idle-with-bias").value - quiet) < 0.11);
  CHECK(row(settling, "noise", "idle-with-bias").flag == Flag::none);
  const Curves fluttering = bent([](double) { return 1.0; }, 0.02);
  CHECK(row(fluttering, "noise", "idle-with-bias").flag == Flag::unsteady);
  CHECK(row(fluttering, "noise", "drive-free").flag == Flag::none);
}
