// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/reference_tone.h"

#include <doctest/doctest.h>

#include <cmath>

#include "method/noise_synthetic.h"
#include "method/synthetic.h"

using namespace kneeprint;
using kneeprint::testing::fewest;
using kneeprint::testing::most;
using kneeprint::testing::read;
using kneeprint::testing::response;
using kneeprint::testing::spec_for;

namespace {

TakeSpec reference_at(int rung) {
  TakeSpec spec = spec_for("reference", 997.0, -60.0 + 6.0 * rung);
  spec.lowest = LevelDbfs(-60.0);
  spec.rung = rung;
  return spec;
}

}  // namespace

TEST_CASE("the reference tone stays at the lowest rung, for about a second") {
  const TakeSpec spec = reference_at(9);
  const Method& m = *find_method("reference");
  const Stimulus s = m.stimulus(spec, Hertz(48000.0));
  double peak = 0.0;
  for (const double x : s.wave.samples) peak = std::max(peak, std::abs(x));
  CHECK(peak == doctest::Approx(1e-3).epsilon(1e-6));
  const double block = m.block_length(spec, Hertz(48000.0)).value();
  CHECK(3.0 * block >= 0.45);
  CHECK(3.0 * block <=
        0.91);  // 0.3 s is the shortest in which 997 Hz, less 0.03 %, has whole cycles
  CHECK(spec.hold_blocks == 4);  // one more for settling
  // Without a ladder's lowest rung it never exceeds the rung's own level.
  TakeSpec low = spec_for("reference", 997.0, -70.0);
  low.lowest = LevelDbfs(0.0);
  for (const double x : m.stimulus(low, Hertz(48000.0)).wave.samples) {
    CHECK_MESSAGE(std::abs(x) <= std::pow(10.0, -3.5) * (1.0 + 1e-9), "louder than its rung");
    if (std::abs(x) > 1.0) break;
  }
}

TEST_CASE("its gain, its place, and nothing that would end the ladder") {
  const TakeSpec spec = reference_at(7);
  TakeVerdict verdict;
  RigView rig;
  rig.send = LevelScale::calibrated(to_volts(LevelDbu(10.0)), Decibels(0.2));
  rig.ret = LevelScale::calibrated(to_volts(LevelDbu(16.0)), Decibels(0.2));
  const Curves c = read(spec,
                        response(
                            spec, [](double x) { return 0.5 * x; }, 1e-7, 3),
                        rig, &verdict);
  REQUIRE(c.scalars.size() == 1);
  CHECK(c.levels.empty());
  CHECK(c.harmonics.empty());
  const ScalarPoint& p = c.scalars[0];
  CHECK(p.figure == "reference-gain");
  CHECK(p.state == "rung 7");
  CHECK(*p.drive == doctest::Approx(-50.0));
  CHECK(*p.value == doctest::Approx(6.0 - 20.0 * std::log10(2.0)).epsilon(1e-4));
  // Type A alone: noise of 1e-7 in a mean of 28800 samples is 0.00002 dB of 0.0005; the scales'
  // 0.2 dB stay out.
  CHECK(*p.expanded_u < 1e-3);
  CHECK(!verdict.output_level);
  CHECK(!verdict.thd_f_percent);
}

TEST_CASE("the interval is that of the noise") {
  constexpr int kRepeats = 200;
  const TakeSpec spec = reference_at(0);
  int covered = 0;
  for (unsigned r = 0; r < kRepeats; ++r) {
    const Curves c = read(spec, response(
                                    spec, [](double x) { return x; }, 1e-5, 100 + r));
    covered += std::abs(*c.scalars.at(0).value) <= *c.scalars[0].expanded_u;
  }
  CHECK(covered >= fewest(kRepeats, 0.95, 0.0005));
  CHECK(covered <= most(kRepeats, 0.95, 0.0005));
}

TEST_CASE("a reference return's own noise counts, too; a lost tone has no gain") {
  const TakeSpec spec = reference_at(0);
  const Waveform take = response(
      spec, [](double x) { return x; }, 1e-5, 1);
  const Waveform drive = response(
      spec, [](double x) { return x; }, 1e-5, 2);
  Curves alone, both;
  const Method& m = *find_method("reference");
  m.read(spec, {take}, {}, alone);
  m.read(spec, {take, &drive}, {}, both);
  const double ratio = *both.scalars.at(0).expanded_u / *alone.scalars.at(0).expanded_u;
  CHECK(ratio > 1.2);  // sqrt 2, give or take what 100 degrees of freedom leave
  CHECK(ratio < 1.7);
  Waveform lost = take;
  for (double& x : lost.samples) x = 0.0;
  Curves nothing;
  m.read(spec, {lost}, {}, nothing);
  CHECK(nothing.scalars.at(0).flag == Flag::noise);
  CHECK(!nothing.scalars[0].value);
}
