// SPDX-License-Identifier: GPL-3.0-or-later
// A whole measurement with silence before the ladder, a reference tone between its steps and the
// way down, on a virtual unit.
#include <doctest/doctest.h>

#include <algorithm>

#include "curve/hysteresis.h"
#include "print/folder.h"
#include "rig/virtual_port.h"
#include "run/describe.h"
#include "run/measure.h"
#include "run/take_reading.h"
#include "temporary_folder.h"

using namespace kneeprint;

namespace {

class Quiet : public Progress {
 public:
  void step(const ProgressStep&) override {}
  void say(const std::string&) override {}
};

long rows(const Curves& c, const std::string& figure) {
  return std::count_if(c.scalars.begin(), c.scalars.end(),
                       [&](const ScalarPoint& p) { return p.figure == figure; });
}

}  // namespace

TEST_CASE("silence, reference tone and a ladder both ways in one run") {
  testing::TemporaryFolder folder;
  MeasureRequest request;
  request.into = folder.path() / "print";
  request.plan.name = "test";
  request.plan.ladder = {{-30.0, PlanUnit::dbfs}, {-10.0, PlanUnit::dbfs}, Decibels(10.0)};
  StepPlan silence{"silence", {}};
  silence.options.duration = Seconds(2.0);
  request.plan.steps = {silence, {"steady", {Hertz(997.0)}}, {"reference", {Hertz(997.0)}}};
  request.plan.blocks = 3;
  request.plan.descend = true;
  request.plan.stop_compression = Decibels(3.0);
  const std::string unit = "sigmoid:bias=0.2";
  const auto port = make_virtual_port(parse_virtual_rig(unit), Hertz(48000.0), 7, {});
  request.rig = virtual_rig(parse_virtual_rig(unit), Hertz(48000.0), {});
  Quiet progress;
  // The reference tone's constant level is no compression.
  CHECK(climb(request, *port, progress).stop.empty());

  const PrintFolder print(request.into);
  const Curves c =
      read_takes(print, read_journal(print.journal_file(), false), request.plan, request.rig);
  CHECK(c.levels.size() == 5);  // three rungs up, two down
  for (const char* figure : {"noise", "noise-a", "noise-468", "hum-total"}) {
    CHECK(rows(c, figure) == 2);
  }
  CHECK(rows(c, "reference-gain") == 3);
  CHECK(rows(c, "gain-drift") == 1);
  // A memoryless unit comes back the same way, and its gain does not drift.
  CHECK(rows(c, "ladder-loop-gain") == 1);
  CHECK(rows(c, "ladder-loop-h2") == 1);
  for (const ScalarPoint& p : c.scalars) {
    if (p.figure.starts_with("ladder-loop") || p.figure == "gain-drift") {
      CAPTURE(p.figure);
      CHECK(p.flag == Flag::noise);
    }
  }
  const Curves up = ascending(c);
  CHECK(up.levels.size() == 3);
  CHECK(2 * fit_data(c, request.plan, request.rig).size() >
        3 * fit_data(up, request.plan, request.rig).size());
}
