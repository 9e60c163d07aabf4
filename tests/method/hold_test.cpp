// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/hold.h"

#include <doctest/doctest.h>

#include <cmath>

#include "method/synthetic.h"

using namespace kneeprint;
using kneeprint::testing::spec_for;

TEST_CASE(
    "every method's stimulus: peak of the sine, ramps of 20 ms and four periods, silent ends") {
  for (const Method& m : methods()) {
    for (const double asked :
         m.needs.frequencies ? std::vector{41.0, 997.0, 4990.0} : std::vector{0.0}) {
      CAPTURE(m.id);
      CAPTURE(asked);
      const TakeSpec spec = spec_for(std::string(m.id), asked, -12.0);
      const Stimulus s = m.stimulus(spec, Hertz(48000.0));
      const auto& x = s.wave.samples;
      double peak = 0.0;
      for (const double v : x) peak = std::max(peak, std::abs(v));
      CHECK(peak <= sine_peak(spec.send) * (1.0 + 1e-12));
      CHECK(peak == doctest::Approx(sine_peak(spec.send)).epsilon(1e-3));
      CHECK(s.hold.end() < x.size());

      // The first non-zero sample to the first block leaves room for the ramp and the margin.
      std::size_t first = 0;
      while (x[first] == 0.0) ++first;
      // A sweep rises within its block: see its own test.
      if (first < s.hold.first_block) {
        const double rise_s = static_cast<double>(s.hold.first_block - first) / 48000.0;
        CHECK(rise_s >= std::max(0.020, 4.0 / s.lowest_tone.value()));
      }
      CHECK(x.front() == 0.0);
      CHECK(x.back() == 0.0);

      // Blocks repeat exactly: whole cycles of every tone.
      double largest = 0.0;
      for (std::size_t n = s.hold.first_block; n + s.hold.block < s.hold.end(); ++n) {
        largest = std::max(largest, std::abs(x[n + s.hold.block] - x[n]));
      }
      CHECK(largest < 1e-9);
    }
  }
}

TEST_CASE("the start is smooth: no step larger than the tone's own slope") {
  const TakeSpec spec = spec_for("steady", 4990.0, 0.0);
  const auto x = find_method("steady")->stimulus(spec, Hertz(48000.0)).wave.samples;
  const double slope = 2.0 * std::numbers::pi * 4993.0 / 48000.0;
  for (std::size_t n = 1; n < x.size(); ++n) CHECK(std::abs(x[n] - x[n - 1]) <= 1.05 * slope);
}

TEST_CASE("the length that a method states is that of its stimulus") {
  int stated = 0;
  for (const Method& m : methods()) {
    if (m.length == nullptr) continue;
    ++stated;
    for (const double rate : {44100.0, 96000.0}) {
      for (const int blocks : {3, 7}) {
        CAPTURE(m.id);
        TakeSpec spec = spec_for(std::string(m.id), m.needs.frequencies ? 41.0 : 0.0, -12.0);
        if (m.needs.tones_required) spec.options.tones = {Hertz(250.0), Hertz(8000.0)};
        spec.hold_blocks = blocks;
        CHECK(m.length(spec, Hertz(rate)) == m.stimulus(spec, Hertz(rate)).wave.samples.size());
      }
    }
  }
  CHECK(stated >= 3);
}
