// SPDX-License-Identifier: GPL-3.0-or-later
#include "print/plan.h"

#include <doctest/doctest.h>

#include <algorithm>
#include <cmath>
#include <nlohmann/json.hpp>

#include "quantity/failure.h"
#include "temporary_folder.h"

namespace kneeprint {
namespace {

using nlohmann::json;

const std::vector<MethodNeeds> kMethods{
    {.id = "steady", .frequencies = true},
    {.id = "smpte"},
    {.id = "ccif"},
    {.id = "pair", .tones = true, .tones_required = true, .ratio = true},
    {.id = "slow", .duration = true, .listening = true},
    {.id = "silence", .duration = true},
    {.id = "multitone", .listening = true},
    {.id = "sweep", .duration = true},
    {.id = "reference", .frequencies = true}};

json full() {
  return json::parse(R"({"format":"kneeprint-plan","version":1,"name":"mine",
    "ladder":{"from":-60,"to":0,"step_db":3,"unit":"dBFS"},
    "steps":[{"method":"steady","frequencies_hz":[41,997,4990.5]},{"method":"smpte"}],
    "orders":12,"block_s":0.25,"blocks":5,"longest_time_constant_s":0.7,"settle_limit_s":6,
    "warm_up_s":1.5,"wanted_uncertainty_db":0.02,"wanted_harmonic_u_db":0.5,"wanted_orders":3,
    "descend":true,"stop":{"thd_f_percent":30,"compression_db":12},
    "ceiling":{"value":20,"unit":"dBu"},"fit_frequency_hz":997})");
}

/// Of a ladder whose top is on the grid.
std::size_t rung_count(const LadderPlan& ladder) {
  const double steps = (ladder.to.value - ladder.from.value) / ladder.step.value();
  return static_cast<std::size_t>(std::lround(steps)) + 1;
}

Plan parse(const json& plan) { return parse_plan(plan.dump(), "plan.json", kMethods); }

/// The message with which the full plan is refused once `pointer` holds `value`.
std::string refusal(const char* pointer, const json& value) {
  json plan = full();
  plan[json::json_pointer(pointer)] = value;
  try {
    parse(plan);
  } catch (const InputError& e) {
    return e.what();
  }
  return "(accepted)";
}

std::string refusal_without(const char* field) {
  json plan = full();
  plan.erase(field);
  try {
    parse(plan);
  } catch (const InputError& e) {
    return e.what();
  }
  return "(accepted)";
}

}  // namespace

TEST_CASE("a full plan is read field by field") {
  const Plan plan = parse(full());
  CHECK(plan.name == "mine");
  CHECK(plan.ladder.from.value == -60.0);
  CHECK(plan.ladder.from.unit == PlanUnit::dbfs);
  CHECK(plan.ladder.to.value == 0.0);
  CHECK(plan.ladder.step == Decibels(3.0));
  REQUIRE(plan.steps.size() == 2);
  CHECK(plan.steps[0].method == "steady");
  CHECK(plan.steps[0].frequencies == std::vector{Hertz(41.0), Hertz(997.0), Hertz(4990.5)});
  CHECK(plan.steps[1].method == "smpte");
  CHECK(plan.steps[1].frequencies.empty());
  CHECK(plan.orders == 12);
  CHECK(plan.block == Seconds(0.25));
  CHECK(plan.blocks == 5);
  CHECK(plan.longest_time_constant == Seconds(0.7));
  CHECK(plan.settle_limit == Seconds(6.0));
  CHECK(plan.warm_up == Seconds(1.5));
  CHECK(plan.wanted_uncertainty == Decibels(0.02));
  CHECK(plan.stop_thd_f_percent == 30.0);
  CHECK(plan.stop_compression == Decibels(12.0));
  REQUIRE(plan.ceiling);
  CHECK(plan.ceiling->value == 20.0);
  CHECK(plan.ceiling->unit == PlanUnit::dbu);
  CHECK(plan.fit_frequency == Hertz(997.0));
}

TEST_CASE("optional fields fall back to the defaults of Plan") {
  const Plan plan = parse(json::parse(R"({"name":"short",
    "ladder":{"from":0.1,"to":2,"step_db":6,"unit":"V"},"steps":[{"method":"ccif"}]})"));
  const Plan defaults;
  CHECK(plan.orders == defaults.orders);
  CHECK(plan.block == defaults.block);
  CHECK(plan.blocks == defaults.blocks);
  CHECK(plan.longest_time_constant == defaults.longest_time_constant);
  CHECK(plan.settle_limit == defaults.settle_limit);
  CHECK(plan.warm_up == defaults.warm_up);
  CHECK(plan.wanted_uncertainty == defaults.wanted_uncertainty);
  CHECK_FALSE(plan.stop_thd_f_percent);
  CHECK_FALSE(plan.stop_compression);
  CHECK_FALSE(plan.ceiling);
  CHECK_FALSE(plan.fit_frequency);
  CHECK(plan.ladder.from.unit == PlanUnit::volts);
}

TEST_CASE("canonical text: equal plans give equal bytes, and nothing is lost on the way") {
  json plan = full();
  plan["ladder"]["from"] = -59.300000000000004;  // needs 17 digits
  const std::string once = plan_json(parse(plan));
  CHECK(plan_json(parse_plan(once, "plan.json", kMethods)) == once);
  CHECK(json::parse(once) == plan);  // every field of the full plan is written, with its value
  // The order in which a person wrote the fields, and ".0", make no difference.
  CHECK(plan_json(parse_plan(json::parse(once).dump(4), "plan.json", kMethods)) == once);
  plan["orders"] = 12.0;
  plan["ladder"]["to"] = -0.0;
  CHECK(plan_json(parse(plan)) == once);
}

TEST_CASE("a step's options are those that its method uses") {
  json plan = full();
  plan["steps"].push_back(
      {{"method", "pair"}, {"tones_hz", {250, 8000}}, {"ratio", 4}, {"every", 3}});
  plan["steps"].push_back({{"method", "pair"}, {"tones_hz", {400, 8000}}});
  plan["steps"].push_back({{"method", "slow"}, {"duration_s", 10}, {"listening_db_spl", 83}});
  const Plan read = parse(plan);
  CHECK(read.steps[2].options.tones == std::vector{Hertz(250.0), Hertz(8000.0)});
  CHECK(read.steps[2].options.ratio == 4.0);
  CHECK(read.steps[2].every == 3);
  CHECK(read.steps[4].options.duration == Seconds(10.0));
  CHECK(read.steps[4].options.listening_db_spl == 83.0);
  CHECK(json::parse(plan_json(read)) == plan);
  plan["steps"].push_back({{"method", "pair"}, {"tones_hz", {250, 8000}}, {"ratio", 4}});
  CHECK_THROWS_AS(parse(plan), InputError);  // the same take twice

  CHECK(refusal("/steps/1", {{"method", "pair"}}) ==
        "plan.json: field \"steps[1].tones_hz\": missing; method \"pair\" needs two frequencies");
  CHECK(refusal("/steps/1", {{"method", "pair"}, {"tones_hz", {250}}}) ==
        "plan.json: field \"steps[1].tones_hz\": found 1 frequencies; expected two");
  CHECK(refusal("/steps/1", {{"method", "pair"}, {"tones_hz", {8000, 250}}}) ==
        "plan.json: field \"steps[1].tones_hz\": expected the lower frequency first");
  CHECK(refusal("/steps/1", {{"method", "smpte"}, {"ratio", 4}}) ==
        "plan.json: field \"steps[1].ratio\": method \"smpte\" does not use it; expected no such "
        "field");
}

TEST_CASE("a refused field is named with what was found and what was expected") {
  CHECK(refusal("/steps/1/method", "foo") ==
        "plan.json: field \"steps[1].method\": unknown method \"foo\"; expected one of: steady, "
        "smpte, ccif, pair, slow, silence, multitone, sweep, reference");
  CHECK(refusal("/ordres", 3)
            .starts_with("plan.json: field \"ordres\": unknown field; expected one of: format, "
                         "version, name,"));
  CHECK(refusal("/ladder/top", 3) ==
        "plan.json: field \"ladder.top\": unknown field; expected one of: from, to, step_db, unit");
  CHECK(
      refusal("/ladder/unit", "dBm") ==
      "plan.json: field \"ladder.unit\": unknown unit \"dBm\"; expected one of: dBFS, dBu, dBV, V");
  CHECK(refusal("/ladder/to", 1) ==
        "plan.json: field \"ladder.to\": level 1 dBFS; expected -140 to 0 dBFS");
  CHECK(refusal("/ladder/from", -141) ==
        "plan.json: field \"ladder.from\": level -141 dBFS; expected -140 to 0 dBFS");
  CHECK(refusal("/ladder/to", -61) ==
        "plan.json: field \"ladder.to\": level -61 dBFS is below \"from\"; expected at least -60 "
        "dBFS");
  CHECK(refusal("/ceiling/value", 61) ==
        "plan.json: field \"ceiling.value\": level 61 dBu; expected -120 to 60 dBu");
  CHECK(refusal("/ceiling", {{"value", -2}, {"unit", "V"}}) ==
        "plan.json: field \"ceiling.value\": negative level -2 V; expected 1e-06 to 1000 V");
  CHECK(refusal("/ladder", {{"from", -1}, {"to", 2}, {"step_db", 3}, {"unit", "V"}}) ==
        "plan.json: field \"ladder.from\": negative level -1 V; expected 1e-06 to 1000 V");
  CHECK(refusal("/ladder/step_db", 0) ==
        "plan.json: field \"ladder.step_db\": found 0; expected a number above 0 and at most 200");
  CHECK(refusal("/ladder/step_db", 0.15) ==
        "plan.json: field \"ladder.step_db\": 0.15 dB makes more than 400 rungs; expected larger "
        "steps");
  CHECK(refusal("/ladder/step_db", 1e-300).find("more than 400 rungs") != std::string::npos);
  CHECK(refusal("/steps", json::array()) ==
        "plan.json: field \"steps\": found []; expected at least one step");
  CHECK(refusal("/steps/0/frequencies_hz", json::array()) ==
        "plan.json: field \"steps[0].frequencies_hz\": found []; expected at least one frequency");
  CHECK(refusal("/steps/0/frequencies_hz", {997, 90001}) ==
        "plan.json: field \"steps[0].frequencies_hz[1]\": found 90001; expected a number above 0 "
        "and at most 90000");
  CHECK(refusal("/steps/0/frequencies_hz", {997, 0}).find("[1]\": found 0;") != std::string::npos);
  CHECK(refusal("/steps/0/frequencies_hz", {997, 997}).find("listed twice") != std::string::npos);
  CHECK(refusal("/steps/1/frequencies_hz", {60}) ==
        "plan.json: field \"steps[1].frequencies_hz\": method \"smpte\" fixes its own tones; "
        "expected no such field");
  CHECK(refusal("/steps/2", {{"method", "smpte"}}).find("every take once") != std::string::npos);
  CHECK(refusal("/fit_frequency_hz", 1000) ==
        "plan.json: field \"fit_frequency_hz\": found 1000; expected a frequency of the steps: 41, "
        "997, 4990.5");
  CHECK(refusal("/settle_limit_s", 1) ==
        "plan.json: field \"settle_limit_s\": 1 s is shorter than 5 blocks of 0.25 s; expected at "
        "least 1.25 s");
  CHECK(refusal("/name", "") == "plan.json: field \"name\": found \"\"; expected a name");
  CHECK(refusal("/version", 2) ==
        "plan.json: written by a newer Kneeprint (format 2, this one reads up to 1)");
  CHECK(refusal("/format", "other").find("expected \"kneeprint-plan\"") != std::string::npos);
}

TEST_CASE("every number has its range, and must be a number") {
  const std::vector<std::pair<const char*, std::vector<json>>> refused{
      {"/orders", {1, 21, 2.5, "ten", nullptr}},
      {"/block_s", {0.09, 10.1, "1"}},
      {"/blocks", {2, 1001, -4}},
      {"/longest_time_constant_s", {0, -1, true}},
      {"/settle_limit_s", {0, -1, 90000}},
      {"/warm_up_s", {-1, "long"}},
      {"/wanted_uncertainty_db", {0, -0.1, 11}},
      {"/stop/thd_f_percent", {0, -3, 1001}},
      {"/stop/compression_db", {0, -3, 101}},
      {"/stop/other", {1}},
      {"/ladder/from", {"low", nullptr}},
      {"/steps/0/frequencies_hz", {"997", 997}},
      {"/steps", {7, {{"method", "smpte"}}}},
      {"/ladder", {7}},
  };
  for (const auto& [pointer, values] : refused) {
    for (const json& value : values) {
      CAPTURE(pointer);
      CAPTURE(value.dump());
      CHECK(refusal(pointer, value).starts_with("plan.json: field \""));
    }
  }
  // 3 x 0.1 is above 0.3 by its rounding.
  json tight = full();
  tight["block_s"] = 0.1;
  tight["blocks"] = 3;
  tight["settle_limit_s"] = 0.3;
  CHECK(parse(tight).settle_limit == Seconds(0.3));
  const std::vector<std::pair<const char*, std::vector<json>>> accepted{
      {"/orders", {2, 20}}, {"/block_s", {0.1, 1.2}},    {"/blocks", {3, 24}},
      {"/warm_up_s", {0}},  {"/ladder/from", {-140, 0}},
  };
  for (const auto& [pointer, values] : accepted) {
    for (const json& value : values) {
      CAPTURE(pointer);
      CAPTURE(value.dump());
      if (std::string(pointer) != "/ladder/from") {
        CHECK(refusal(pointer, value) == "(accepted)");
      } else {
        CHECK(refusal("/ladder", {{"from", value}, {"to", 0}, {"step_db", 10}, {"unit", "dBFS"}}) ==
              "(accepted)");
      }
    }
  }
}

TEST_CASE("name, ladder, its fields and steps are required; the rest is not") {
  for (const char* field : {"name", "ladder", "steps"}) {
    CHECK(refusal_without(field).starts_with("plan.json: field \"" + std::string(field) +
                                             "\": missing; expected"));
  }
  const json given = full();
  for (const auto& [field, ignored] : given.items()) {
    if (field == "name" || field == "ladder" || field == "steps") continue;
    if (field == "format" || field == "version") continue;  // one alone says too little
    CAPTURE(field);
    CHECK(refusal_without(field.c_str()) == "(accepted)");
  }
  CHECK(refusal("/ladder", {{"from", -6}, {"to", 0}, {"step_db", 1}}) ==
        "plan.json: field \"ladder.unit\": missing; expected one of: dBFS, dBu, dBV, V");
}

TEST_CASE("what is not a plan at all") {
  CHECK_THROWS_WITH_AS(parse_plan("[]", "p", kMethods), "p: found []; expected an object",
                       InputError);
  CHECK_THROWS_AS(parse_plan("{\"name\":", "p", kMethods), InputError);
}

TEST_CASE("a ladder has at most 400 rungs, its top among them") {
  const auto ladder = [](double from, double to, double step, const char* unit) {
    return refusal("/ladder", {{"from", from}, {"to", to}, {"step_db", step}, {"unit", unit}});
  };
  // 0.1 is no binary fraction: the count must not gain a rung by its rounding.
  CHECK(ladder(-39.9, 0.0, 0.1, "dBFS") == "(accepted)");
  CHECK(ladder(-40.0, 0.0, 0.1, "dBFS").find("400 rungs") != std::string::npos);
  CHECK(ladder(-39.95, 0.0, 0.1, "dBFS").find("400 rungs") != std::string::npos);
  CHECK(ladder(-5.0, -5.0, 200.0, "dBV") == "(accepted)");
  // Volts climb by ratio: 39.9 dB is a factor of 10^1.995 = 98.855, 40 dB one of 100.
  CHECK(ladder(0.01, 0.98, 0.1, "V") == "(accepted)");
  CHECK(ladder(0.01, 1.0, 0.1, "V").find("400 rungs") != std::string::npos);
}

TEST_CASE("every built-in plan passes the checks of a file and round-trips") {
  for (const std::string& name : built_in_plans()) {
    CAPTURE(name);
    const Plan plan = load_plan(name, kMethods);
    CHECK(plan.name == name);
    const std::string text = plan_json(plan);
    CHECK(plan_json(parse_plan(text, name, kMethods)) == text);
    CHECK(plan.ladder.to.unit == PlanUnit::dbfs);
    CHECK(plan.ladder.to.value == 0.0);
  }
}

TEST_CASE("the built-in plans are what their names promise") {
  // Longest possible sound of the steady and two-tone takes: each held to its limit, with 0.24 s of
  // ramps and gaps.
  const auto longest = [](const Plan& plan) {
    std::size_t takes = 0;
    for (const StepPlan& step : plan.steps) {
      if (step.method != "steady" && step.method != "smpte" && step.method != "ccif") continue;
      takes += std::max<std::size_t>(1, step.frequencies.size());
    }
    takes *= rung_count(plan.ladder);
    return static_cast<double>(takes) * (plan.settle_limit.value() + 0.24);
  };
  CHECK(longest(load_plan("glance", kMethods)) < 28.0);

  const Plan portrait = load_plan("portrait", kMethods);
  CHECK(longest(portrait) < 600.0);
  REQUIRE(portrait.steps.size() == 7);
  CHECK(portrait.steps[1].frequencies == std::vector{Hertz(41.0), Hertz(997.0), Hertz(4990.0)});
  CHECK(rung_count(portrait.ladder) == 21);
  CHECK(portrait.stop_thd_f_percent == 30.0);
  CHECK(portrait.stop_compression == Decibels(12.0));

  const Plan atlas = load_plan("atlas", kMethods);
  CHECK(rung_count(atlas.ladder) == 11);
  REQUIRE(atlas.steps.size() == 6);
  CHECK(atlas.steps[1].frequencies.size() == 12);
  for (const Hertz f : atlas.steps[1].frequencies) {
    for (int order = 1; order <= 10 && (order == 1 || order * f.value() < 20000.0); ++order) {
      for (const double mains : {50.0, 60.0}) {
        CAPTURE(f.value());
        CHECK(std::abs(std::remainder(order * f.value(), mains)) >= 2.0);
      }
    }
  }
}

TEST_CASE("a built-in plan of a method that is not known is refused") {
  CHECK_THROWS_AS(load_plan("portrait", {kMethods.front()}), InputError);
}

TEST_CASE("a plan comes from a file, or the built-in names are listed") {
  const testing::TemporaryFolder folder;
  const std::filesystem::path file = folder.path() / "mine.json";
  testing::write_bytes(file, full().dump());
  CHECK(load_plan(file.string(), kMethods).name == "mine");
  testing::write_bytes(file, "{}");
  CHECK_THROWS_WITH_AS(
      load_plan(file.string(), kMethods),
      (file.string() + ": field \"name\": missing; expected text in quotes").c_str(), InputError);
  CHECK_THROWS_WITH_AS(
      load_plan("potrait", kMethods),
      "no plan \"potrait\": neither a file nor a built-in plan (glance, portrait, atlas)",
      InputError);
  CHECK_THROWS_AS(load_plan(folder.path().string(), kMethods), InputError);
}

}  // namespace kneeprint
