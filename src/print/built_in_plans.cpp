// SPDX-License-Identifier: GPL-3.0-or-later
// The plans that need no file. Their ladders are in dBFS of the send, so that they run on every
// rig.
#include <fmt/format.h>

#include <filesystem>
#include <string>
#include <utility>
#include <vector>

#include "platform/json_fields.h"
#include "platform/read_text.h"
#include "print/plan.h"
#include "quantity/failure.h"

namespace kneeprint {
namespace {

LadderPlan ladder_dbfs(double from, double step_db) {
  return {{from, PlanUnit::dbfs}, {0.0, PlanUnit::dbfs}, Decibels(step_db)};
}

/// `every`: at every so many-th rung, counted from the lowest.
StepPlan step(const std::string& method, std::vector<Hertz> frequencies = {}, int every = 1) {
  return {method, std::move(frequencies), every, {}};
}

/// Past these a unit only grows hotter: the curve has been seen.
void stop_when_bent(Plan& plan) {
  plan.stop_thd_f_percent = 30.0;
  plan.stop_compression = Decibels(12.0);
}

/// 12 rungs of at most 2 s, with 0.24 s of ramps and gaps each: 27 s of sound.
Plan glance() {
  Plan plan;
  plan.name = "glance";
  plan.ladder = ladder_dbfs(-44.0, 4.0);
  plan.steps = {step("steady", {Hertz(997.0)})};
  plan.blocks = 3;
  plan.settle_limit = Seconds(2.0);
  stop_when_bent(plan);
  return plan;
}

/// Transformers saturate at the low frequency first; tape and slewing show at the high one.
Plan portrait() {
  Plan plan;
  plan.name = "portrait";
  plan.ladder = ladder_dbfs(-60.0, 3.0);
  plan.steps = {step("silence"),
                step("steady", {Hertz(41.0), Hertz(997.0), Hertz(4990.0)}),
                step("smpte"),
                step("ccif"),
                step("multitone", {}, 6),
                step("sweep", {}, 6),
                step("reference", {Hertz(997.0)}, 3)};
  plan.fit_frequency = Hertz(997.0);
  stop_when_bent(plan);
  return plan;
}

/// Near the octaves, a few hertz beside the preferred numbers: harmonics up to the tenth then keep
/// at least 2 Hz away from every multiple of 50 and 60 Hz.
Plan atlas() {
  Plan plan;
  plan.name = "atlas";
  plan.ladder = ladder_dbfs(-60.0, 6.0);
  StepPlan steady = step("steady");
  for (const double hz :
       {31.5, 63.5, 127.0, 253.0, 503.0, 997.0, 2005.0, 3172.0, 4990.0, 8083.0, 12575.0, 15925.0}) {
    steady.frequencies.emplace_back(hz);
  }
  plan.steps = {step("silence"),      steady,
                step("smpte"),        step("ccif"),
                step("sweep", {}, 3), step("reference", {Hertz(997.0)}, 2)};
  plan.fit_frequency = Hertz(997.0);
  stop_when_bent(plan);
  return plan;
}

}  // namespace

std::vector<std::string> built_in_plans() { return {"glance", "portrait", "atlas"}; }

Plan load_plan(const std::string& name_or_file, const std::vector<MethodNeeds>& known_methods) {
  for (const Plan& plan : {glance(), portrait(), atlas()}) {
    if (plan.name == name_or_file) return parse_plan(plan_json(plan), plan.name, known_methods);
  }
  std::error_code ignored;
  if (!std::filesystem::exists(name_or_file, ignored)) {
    throw InputError(fmt::format("no plan \"{}\": neither a file nor a built-in plan ({})",
                                 name_or_file, listed(built_in_plans())));
  }
  return parse_plan(read_text(name_or_file), name_or_file, known_methods);
}

}  // namespace kneeprint
