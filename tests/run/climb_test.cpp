// SPDX-License-Identifier: GPL-3.0-or-later
#include <doctest/doctest.h>

#include <cmath>

#include "curve/csv.h"
#include "print/folder.h"
#include "quantity/failure.h"
#include "rig/virtual_port.h"
#include "run/measure.h"
#include "run/take_reading.h"
#include "temporary_folder.h"

using namespace kneeprint;

namespace {

class Silent : public Progress {
 public:
  void step(const ProgressStep&) override { ++steps; }
  void say(const std::string& sentence) override { said += sentence + "\n"; }
  int steps = 0;
  std::string said;
};

Plan small_plan() {
  Plan p;
  p.name = "test";
  p.ladder = {{-30.0, PlanUnit::dbfs}, {-10.0, PlanUnit::dbfs}, Decibels(10.0)};
  p.steps = {{"steady", {Hertz(997.0)}}};
  p.blocks = 3;
  return p;
}

struct Run {
  explicit Run(const std::string& unit, Plan plan = small_plan(), ConverterModel model = {})
      : port(make_virtual_port(parse_virtual_rig(unit), Hertz(48000.0), 7, model)) {
    request.into = folder.path() / "print";
    request.plan = std::move(plan);
    request.rig = virtual_rig(parse_virtual_rig(unit), Hertz(48000.0), model);
  }
  ClimbEnd climb() { return kneeprint::climb(request, *port, progress); }
  Curves curves() const {
    const PrintFolder print(request.into);
    return read_takes(print, read_journal(print.journal_file(), false), request.plan, request.rig);
  }

  testing::TemporaryFolder folder;
  std::unique_ptr<Port> port;
  MeasureRequest request;
  Silent progress;
};

}  // namespace

TEST_CASE("a whole ladder leaves a take a rung, and the chain check before them") {
  Run run("sigmoid");
  const ClimbEnd end = run.climb();
  CHECK(end.stop.empty());
  const Journal journal = read_journal(PrintFolder(run.request.into).journal_file(), false);
  CHECK(journal.takes.size() == 4);
  CHECK(journal.takes[0].rung == -1);
  CHECK(run.curves().levels.size() == 3);
  CHECK(run.progress.said.find("upright") != std::string::npos);
}

TEST_CASE("the plan's THD_F ends the ladder, and the journal says why") {
  Plan plan = small_plan();
  plan.ladder = {{-50.0, PlanUnit::dbfs}, {-10.0, PlanUnit::dbfs}, Decibels(5.0)};
  plan.stop_thd_f_percent = 1.0;
  Run run("sigmoid", plan);
  const ClimbEnd end = run.climb();
  CHECK(end.stop == "thd");
  CHECK_FALSE(end.by_guard);
  const Journal journal = read_journal(PrintFolder(run.request.into).journal_file(), false);
  REQUIRE(journal.stops.size() == 1);
  CHECK(journal.stops[0].reason == "thd");
  const auto levels = run.curves().levels;
  REQUIRE(levels.size() >= 2);
  CHECK(levels.size() < 9);
  CHECK(*levels.back().thd_f_percent >= 1.0);
  CHECK(*levels[levels.size() - 2].thd_f_percent < 1.0);
}

TEST_CASE("compression ends the ladder") {
  Plan plan = small_plan();
  plan.ladder = {{-30.0, PlanUnit::dbfs}, {0.0, PlanUnit::dbfs}, Decibels(5.0)};
  plan.stop_compression = Decibels(1.0);
  CHECK(Run("sigmoid", plan).climb().stop == "compression");
}

TEST_CASE("a ceiling cuts the ladder and nothing above it is played") {
  Run run("sigmoid");
  run.request.ceiling = LevelDbfs(-15.0);
  CHECK(run.climb().stop == "ceiling");
  for (const LevelPoint& p : run.curves().levels) CHECK(p.drive <= 24.0 - 15.0 + 0.01);
}

TEST_CASE("the ladder stops before the return would clip, and keeps what it has") {
  // Small-signal gain 8: -10 dBFS would come back at +8 dBFS.
  Run run("sigmoid:limit=40,drive=0.2,bias=0");
  const ClimbEnd end = run.climb();
  CHECK(end.stop == "return-hot");
  CHECK(end.by_guard);
  CHECK(run.curves().levels.size() == 2);
}

TEST_CASE("a return that clips within a take mutes the send and ends the run") {
  Plan plan = small_plan();
  plan.ladder = {{-10.0, PlanUnit::dbfs}, {-5.0, PlanUnit::dbfs}, Decibels(5.0)};
  Run run("sigmoid:limit=40,drive=0.2,bias=0", plan);
  const ClimbEnd end = run.climb();
  CHECK(end.stop == "return-hot");
  CHECK(end.by_guard);
  CHECK(end.sentence.find("pad") != std::string::npos);
}

TEST_CASE("a reference return replaces the nominal drive and its delay") {
  ConverterModel model;
  model.reference = true;
  Run run("triode", small_plan(), model);
  run.climb();
  const Curves curves = run.curves();
  REQUIRE(curves.levels.size() == 3);
  for (std::size_t i = 0; i < 3; ++i) {
    const double nominal = 24.0 - 30.0 + 10.0 * static_cast<double>(i);
    // Send and return each off by their hidden errors of 0.01 dB standard uncertainty.
    CHECK(std::abs(curves.levels[i].drive - nominal) < 0.06);
    CHECK(curves.levels[i].drive != nominal);
    CHECK(curves.levels[i].polarity == -1.0);
  }
}

TEST_CASE("a second measurement does not overwrite the first") {
  Run run("sigmoid");
  run.climb();
  CHECK_THROWS_AS(run.climb(), InputError);
}

TEST_CASE("resuming with another plan is refused; a finished run resumes to the same takes") {
  Run run("sigmoid");
  run.climb();
  const auto before = run.curves();
  run.request.resume = true;
  run.climb();
  const auto after = run.curves();
  REQUIRE(before.harmonics.size() == after.harmonics.size());
  for (std::size_t i = 0; i < before.harmonics.size(); ++i) {
    CHECK(before.harmonics[i].in_phase == after.harmonics[i].in_phase);
  }
  run.request.plan.blocks = 5;
  CHECK_THROWS_AS(run.climb(), InputError);
}

TEST_CASE("a damaged take is made again on resume") {
  Run run("sigmoid");
  run.climb();
  const auto before = run.curves();
  const PrintFolder print(run.request.into);
  const Journal journal = read_journal(print.journal_file(), false);
  std::filesystem::resize_file(print.path() / journal.takes[2].file, 1000);
  run.request.resume = true;
  run.climb();
  CHECK(run.progress.said.find("made again") != std::string::npos);
  const auto after = run.curves();
  for (std::size_t i = 0; i < before.harmonics.size(); ++i) {
    CHECK(before.harmonics[i].in_phase == after.harmonics[i].in_phase);
  }
}

TEST_CASE("takes are held until the wanted uncertainty of harmonics is reached or time is spent") {
  Plan plan = small_plan();
  plan.ladder = {{-70.0, PlanUnit::dbfs}, {-10.0, PlanUnit::dbfs}, Decibels(15.0)};
  plan.wanted_harmonic_u = Decibels(0.5);
  plan.wanted_orders = 3;
  plan.settle_limit = Seconds(8.0);
  Run run("sigmoid:limit=4,drive=0.4,bias=0.15", plan);
  run.climb();
  const auto levels = run.curves().levels;
  const auto harmonics = run.curves().harmonics;
  REQUIRE(levels.size() == 5);
  CHECK(levels.front().integration == "time-spent");  // H3 is far under the noise there
  CHECK(levels.front().blocks == 13);                 // of 0.6 s: all that 8 s hold
  CHECK(levels.back().integration == "reached");
  CHECK(levels.back().blocks == 4);
  for (const HarmonicPoint& h : harmonics) {
    if (h.drive != levels.back().drive || h.order < 2 || h.order > 3) continue;
    CHECK(*h.expanded_u_db <= 0.5);
  }
}

TEST_CASE("a ladder that descends takes the steady steps again, and resumes to the same") {
  Plan plan = small_plan();
  plan.descend = true;
  plan.steps.push_back({"smpte", {}, 2, {}});
  Run run("sigmoid", plan);
  CHECK(run.climb().stop.empty());
  const Journal journal = read_journal(PrintFolder(run.request.into).journal_file(), false);
  // Chain check, three rungs up, two of them with a two-tone take, two rungs down.
  CHECK(journal.takes.size() == 1 + 3 + 2 + 2);
  const std::string before = levels_csv(run.curves());
  run.request.resume = true;
  run.climb();
  CHECK(levels_csv(run.curves()) == before);
}

TEST_CASE("for a unit without memory four fifths of the time are integration") {
  Plan plan = small_plan();
  plan.steps = {
      {"steady", {Hertz(41.0), Hertz(997.0), Hertz(4990.0)}}, {"smpte", {}}, {"ccif", {}}};
  plan.blocks = 4;
  Run run("sigmoid", plan);
  run.climb();
  const Journal journal = read_journal(PrintFolder(run.request.into).journal_file(), false);
  double sound = 0.0, integration = 0.0;
  for (const JournalTake& t : journal.takes) {
    if (t.rung < 0) continue;
    CHECK(t.read_s > 0.0);
    CHECK(t.sound_s > t.read_s);
    sound += t.sound_s + t.tail_s + t.discarded_s;
    integration += t.read_s - t.settling_s;
  }
  CHECK(integration >= 0.8 * sound);
}
