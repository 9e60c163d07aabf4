// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/continuity.h"

#include <doctest/doctest.h>

#include <cmath>

#include "method/steady.h"
#include "method/synthetic.h"
#include "signal/fft.h"

using namespace kneeprint;
using kneeprint::testing::response;
using kneeprint::testing::spec_for;

namespace {

double gentle(double x) { return std::tanh(1.5 * x) / 1.5; }

// `frames` > 0: that many are lost at `at`; < 0: that many are repeated.
Waveform jump(const Waveform& w, std::size_t at, long frames) {
  Waveform out = w;
  for (std::size_t n = at; n < w.samples.size(); ++n) {
    const long from = static_cast<long>(n) + frames;
    out.samples[n] = from < static_cast<long>(w.samples.size())
                         ? w.samples[static_cast<std::size_t>(from)]
                         : 0.0;
  }
  return out;
}

}  // namespace

TEST_CASE(
    "lost and repeated frames are found on every kind of take, wherever they fall in the hold") {
  for (const Method& m : methods()) {
    const TakeSpec spec = spec_for(std::string(m.id), m.needs.frequencies ? 997.0 : 0.0, -12.0);
    const Stimulus s = m.stimulus(spec, Hertz(48000.0));
    const Waveform clean = response(spec, gentle, 1e-5, 5);
    CHECK_FALSE(check_continuity(clean, s.hold).jumped);
    const std::size_t length = s.hold.end() - s.hold.first_block;
    for (const long frames : {1L, 7L, 64L, 500L, 1024L, -1L, -333L, -1024L}) {
      for (const double place : {0.1, 0.3, 0.5, 0.7, 0.9}) {
        CAPTURE(m.id);
        CAPTURE(frames);
        CAPTURE(place);
        const auto at =
            s.hold.first_block + static_cast<std::size_t>(place * static_cast<double>(length));
        CHECK(check_continuity(jump(clean, at, frames), s.hold).jumped);
      }
    }
  }
}

TEST_CASE("a settling unit, a click and noise are no jumps") {
  const TakeSpec spec = spec_for("steady", 997.0, -12.0);
  const Stimulus s = find_method("steady")->stimulus(spec, Hertz(48000.0));
  Waveform settling = response(spec, gentle, 1e-6, 6);
  for (std::size_t n = 0; n < settling.samples.size(); ++n) {
    settling.samples[n] *= 1.0 - 0.3 * std::exp(-static_cast<double>(n) / 48000.0 / 0.05);
  }
  CHECK_FALSE(check_continuity(settling, s.hold).jumped);
  Waveform clicked = response(spec, gentle, 1e-6, 7);
  clicked.samples[s.hold.first_block + 30000] += 0.1;
  CHECK_FALSE(check_continuity(clicked, s.hold).jumped);
  for (unsigned seed = 10; seed < 60; ++seed) {
    CHECK_FALSE(check_continuity(response(spec, gentle, 1e-3, seed), s.hold).jumped);
  }
}

TEST_CASE("a settling unit whose change ends in the last bit of the converters is no jump") {
  const TakeSpec spec = spec_for("ccif", 0.0, -8.0);
  const Stimulus s = find_method("ccif")->stimulus(spec, Hertz(48000.0));
  Waveform settling = response(spec, gentle);
  for (std::size_t n = 0; n < settling.samples.size(); ++n) {
    const double t = static_cast<double>(n) / 48000.0;
    settling.samples[n] += 0.3 * std::exp(-t / 0.02);
    settling.samples[n] = std::round(settling.samples[n] * 8388608.0) / 8388608.0;  // 24 bits
  }
  CHECK_FALSE(check_continuity(settling, s.hold).jumped);
}

TEST_CASE("different clocks show as a steady turn of phase") {
  const TakeSpec spec = spec_for("steady", 997.0, -12.0);
  const Stimulus s = find_method("steady")->stimulus(spec, Hertz(48000.0));
  Waveform drifting = s.wave;
  const double played = steady_frequency(spec, Hertz(48000.0)).value();
  for (std::size_t n = 0; n < drifting.samples.size(); ++n) {
    const double t = static_cast<double>(n) - static_cast<double>(s.hold.first_block);
    drifting.samples[n] =
        0.25 * std::cos(2.0 * std::numbers::pi * played * t / 48000.0 * (1.0 + 5e-6));
  }
  CHECK_FALSE(check_continuity(drifting, s.hold).jumped);
  CHECK(check_continuity(drifting, s.hold).clock_ppm == doctest::Approx(5.0).epsilon(0.05));
  CHECK(std::abs(check_continuity(response(spec, gentle, 1e-5, 8), s.hold).clock_ppm) < 0.05);
}

TEST_CASE("a sweep tells the clock by all its strong lines, and a weak one is not misread") {
  const Hertz rate(16000.0);
  const TakeSpec spec = spec_for("sweep", 0.0, -30.0, rate);
  const Stimulus s = find_method("sweep")->stimulus(spec, rate);
  // Block b later by b * block * 2e-6 samples: a return 2 ppm slow. The gaps take the ends.
  Waveform drifting = s.wave;
  for (int b = 0; b < s.hold.blocks; ++b) {
    const auto start =
        static_cast<long>(s.hold.first_block + static_cast<std::size_t>(b) * s.hold.block);
    const double late = 2e-6 * b * static_cast<double>(s.hold.block);
    auto spectrum =
        forward_fft(std::span(s.wave.samples).subspan(s.hold.first_block, s.hold.block));
    for (std::size_t k = 0; k < spectrum.size(); ++k) {
      spectrum[k] *= std::polar(1.0, -2.0 * std::numbers::pi * static_cast<double>(k) * late /
                                         static_cast<double>(s.hold.block));
    }
    const auto moved = inverse_fft(spectrum, s.hold.block);
    std::copy(moved.begin(), moved.end(), drifting.samples.begin() + start);
  }
  CHECK_FALSE(check_continuity(drifting, s.hold).jumped);
  CHECK(check_continuity(drifting, s.hold).clock_ppm == doctest::Approx(-2.0).epsilon(0.01));
  // 47 dB between drive and noise. The angle of one line alone is uncertain by some 0.5 ppm.
  std::mt19937_64 random(12);
  std::normal_distribution<double> noise(0.0, 1e-4);
  for (int run = 0; run < 100; ++run) {
    Waveform take = s.wave;
    for (double& x : take.samples) x += noise(random);
    CHECK(std::abs(check_continuity(take, s.hold).clock_ppm) < 0.2);
  }
}
