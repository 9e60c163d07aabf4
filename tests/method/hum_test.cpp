// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/hum.h"

#include <doctest/doctest.h>

#include <cmath>
#include <functional>
#include <numbers>
#include <vector>

#include "method/noise_synthetic.h"

using namespace kneeprint;
using kneeprint::testing::covers;
using kneeprint::testing::fewest;
using kneeprint::testing::kNoiseRate;
using kneeprint::testing::most;
using kneeprint::testing::NoiseMaker;

namespace {

constexpr double kTurn = 2.0 * std::numbers::pi;

double white(double) { return 1.0; }
double pink(double f) { return 100.0 / f; }

struct Line {
  int multiple;
  double peak;
};

// Lines of a mains whose frequency wanders by +-`wander` with a period of 7 s. Returns the mean
// frequency over the recording.
double add_hum(Waveform& w, double mains, double wander, const std::vector<Line>& lines,
               NoiseMaker& make) {
  std::vector<double> phases;
  for (std::size_t i = 0; i <= lines.size(); ++i) phases.push_back(make.phase());
  const auto turned = [&](double t) {
    return kTurn * mains * t + wander * 7.0 * std::sin(kTurn * t / 7.0 + phases.back());
  };
  for (std::size_t n = 0; n < w.samples.size(); ++n) {
    const double angle = turned(static_cast<double>(n) / w.rate.value());
    for (std::size_t i = 0; i < lines.size(); ++i) {
      w.samples[n] += lines[i].peak * std::cos(lines[i].multiple * angle + phases[i]);
    }
  }
  const double length = w.duration().value();
  return (turned(length) - turned(0.0)) / (kTurn * length);
}

Hum hum_in(const Waveform& w) { return find_hum(NoiseSpectrum(w, kHumSegment)); }

}  // namespace

TEST_CASE("in noise alone hum is found no more often than the family's 5 %") {
  constexpr int kRepeats = 60;
  NoiseMaker make(21);
  for (const auto& shape : {white, pink}) {
    int found = 0;
    for (int r = 0; r < kRepeats; ++r) {
      const Hum hum = hum_in(make.noise(shape, 5.0));
      found += hum.base_hz != 0;
      CHECK((hum.base_hz != 0 || hum.limit > 0.0));
    }
    CHECK(found <= most(kRepeats, 0.05, 0.0005));
  }
}

TEST_CASE("levels and frequency of hum: intervals cover, wandering or not") {
  constexpr int kRepeats = 60;
  const std::vector<Line> lines = {{1, 30.0}, {2, 6.0}, {3, 12.0}, {6, 8.0}};
  NoiseMaker make(22);
  int family = 0;
  for (const double wander : {0.0, 0.05}) {
    for (const double mains : {50.07, 59.93}) {
      int levels = 0, frequency = 0, complete = 0;
      for (int r = 0; r < kRepeats; ++r) {
        Waveform w = make.noise(family % 2 == 0 ? white : pink, 5.0);
        const double mean = add_hum(w, mains, wander, lines, make);
        const Hum hum = hum_in(w);
        CHECK(hum.base_hz == (mains < 55.0 ? 50 : 60));
        complete += hum.lines.size() == lines.size();
        for (std::size_t i = 0; i < std::min(hum.lines.size(), lines.size()); ++i) {
          if (hum.lines[i].multiple != lines[i].multiple) continue;
          levels += covers(hum.lines[i].power, 0.5 * lines[i].peak * lines[i].peak);
        }
        frequency += covers(hum.frequency, mean);
      }
      CAPTURE(wander);
      CAPTURE(mains);
      // Twelve bounds in all; 0.1 % for the whole family. The frequency's interval is wider than it
      // need be (overlapping segments), so it has a lower bound only; a false line may join in 5 %.
      constexpr double kChance = 0.001 / 16;
      const int figures = kRepeats * static_cast<int>(lines.size());
      CHECK(levels >= fewest(figures, 0.95, kChance));
      CHECK(levels <= most(figures, 0.95, kChance));
      CHECK(frequency >= fewest(kRepeats, 0.95, kChance));
      CHECK(complete >= fewest(kRepeats, 0.95, kChance));
      ++family;
    }
  }
}
