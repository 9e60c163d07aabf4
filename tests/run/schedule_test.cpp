// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/schedule.h"

#include <doctest/doctest.h>

#include "quantity/failure.h"

using namespace kneeprint;

namespace {

Plan simple_plan() {
  Plan p;
  p.name = "test";
  p.ladder = {{-60.0, PlanUnit::dbfs}, {0.0, PlanUnit::dbfs}, Decibels(7.0)};
  p.steps = {{"steady", {Hertz(41.0), Hertz(997.0)}}, {"smpte", {}}};
  return p;
}

Rig calibrated() {
  Rig r;
  r.send_scale = r.return_scale = LevelScale::calibrated(to_volts(LevelDbu(24.0)), Decibels(0.01));
  return r;
}

}  // namespace

TEST_CASE("the ladder ascends and includes its top") {
  const Ladder l = ladder_of(simple_plan(), {}, LevelDbfs(0.0));
  CHECK(l.rungs.front() == LevelDbfs(-60.0));
  CHECK(l.rungs.back() == LevelDbfs(0.0));
  CHECK(l.rungs.size() == 10);
  for (std::size_t i = 1; i < l.rungs.size(); ++i) CHECK(l.rungs[i] > l.rungs[i - 1]);
  CHECK_FALSE(l.cut_by_ceiling);
}

TEST_CASE("no rung above the ceiling") {
  const Ladder l = ladder_of(simple_plan(), {}, LevelDbfs(-20.0));
  CHECK(l.cut_by_ceiling);
  for (const LevelDbfs r : l.rungs) CHECK(r <= LevelDbfs(-20.0));
  CHECK_THROWS_AS(ladder_of(simple_plan(), {}, LevelDbfs(-70.0)), InputError);
}

TEST_CASE("a live device without a rig file stays at -20 dBFS until another ceiling is named") {
  Rig live;
  live.kind = RigKind::live;
  CHECK(ceiling_of(simple_plan(), live, {}, false) == LevelDbfs(-20.0));
  CHECK(ceiling_of(simple_plan(), live, LevelDbfs(-6.0), false) == LevelDbfs(-6.0));
  Plan plan = simple_plan();
  plan.ceiling = PlanLevel{-3.0, PlanUnit::dbfs};
  CHECK(ceiling_of(plan, live, {}, false) == LevelDbfs(-20.0));
  plan.ceiling = PlanLevel{-30.0, PlanUnit::dbfs};
  CHECK(ceiling_of(plan, live, {}, false) == LevelDbfs(-30.0));
  CHECK(ceiling_of(plan, live, LevelDbfs(-6.0), false) == LevelDbfs(-30.0));
  CHECK(ceiling_of(simple_plan(), live, {}, true) == LevelDbfs(0.0));
}

TEST_CASE("levels in volts, dBV and dBu need a calibrated rig") {
  CHECK_THROWS_AS(send_level({4.0, PlanUnit::dbu}, {}, "ladder.to"), InputError);
  CHECK(send_level({4.0, PlanUnit::dbu}, calibrated(), "x").value() == doctest::Approx(-20.0));
  // 1.227653 V rms = +4 dBu = 1.7815 dBV.
  CHECK(send_level({1.22765298798388, PlanUnit::volts}, calibrated(), "x").value() ==
        doctest::Approx(-20.0));
  CHECK(send_level({1.781512503836, PlanUnit::dbv}, calibrated(), "x").value() ==
        doctest::Approx(-20.0));
}

TEST_CASE("takes are numbered rung by rung after the chain check") {
  const Plan p = simple_plan();
  Rig rig;
  const auto takes = takes_of_rung(p, rig, LevelDbfs(-12.0), 2);
  REQUIRE(takes.size() == 3);
  CHECK(takes_of_rung(p, rig, LevelDbfs(-60.0), 0).front().number == 1);
  CHECK(takes[1].number == 8);
  CHECK(takes[1].asked == Hertz(997.0));
  CHECK(takes[2].method == "smpte");
  CHECK(takes[0].hold_blocks >= 4);
}

TEST_CASE("every number leads back to its take, whatever the plan plays") {
  Plan p = simple_plan();
  p.descend = true;
  p.steps[1].every = 3;
  const Rig rig;
  int last = 0;
  for (int rung = 0; rung < 7; ++rung) {
    for (const bool down : {false, true}) {
      for (const TakeSpec& spec : takes_of_rung(p, rig, LevelDbfs(-20.0), rung, down)) {
        CHECK(spec.number > last);
        last = spec.number;
        const auto back = take_by_number(p, rig, spec.number, spec.send, rung);
        REQUIRE(back.has_value());
        CHECK(back->method == spec.method);
        CHECK(back->asked == spec.asked);
        CHECK(back->down == down);
        CHECK((spec.method == "steady" || (rung % 3 == 0 && !down)));
      }
    }
  }
  CHECK_FALSE(take_by_number(p, rig, 0, LevelDbfs(-20.0), 0).has_value());
}

TEST_CASE("the fit uses the plan's frequency, else the one nearest to 997 Hz") {
  Plan p = simple_plan();
  CHECK(fit_frequency(p) == 997.0);
  p.fit_frequency = Hertz(41.0);
  CHECK(fit_frequency(p) == 41.0);
}

TEST_CASE("tones that the rate cannot carry are refused") {
  Plan p = simple_plan();
  check_rate(p, Hertz(44100.0));
  CHECK_THROWS_AS(check_rate(p, Hertz(32000.0)), InputError);
  p.steps = {{"steady", {Hertz(20000.0)}}};
  CHECK_THROWS_AS(check_rate(p, Hertz(40000.0)), InputError);
}

TEST_CASE("pairs of a plan are held to what its rate carries; square and sine from 96 kHz on") {
  Plan p = simple_plan();
  StepOptions options;
  options.tones = {Hertz(19000.0), Hertz(20000.0)};
  p.steps = {{"ccif", {}, 1, options}};
  check_rate(p, Hertz(44100.0));
  p.steps[0].options.tones = {Hertz(20000.0), Hertz(21000.0)};
  CHECK_THROWS_AS(check_rate(p, Hertz(44100.0)), InputError);
  check_rate(p, Hertz(48000.0));
  p.steps = {{"modulation", {}, 1, options}};
  p.steps[0].options.tones = {Hertz(1000.0), Hertz(1000.001)};
  CHECK_THROWS_AS(check_rate(p, Hertz(48000.0)), InputError);
  p.steps = {{"square-sine", {}}};
  check_rate(p, Hertz(96000.0));
  CHECK_THROWS_AS(check_rate(p, Hertz(48000.0)), InputError);
}
