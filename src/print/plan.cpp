// SPDX-License-Identifier: GPL-3.0-or-later
#include "print/plan.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <stdexcept>
#include <utility>

#include "platform/json_fields.h"

namespace kneeprint {
namespace {

using nlohmann::ordered_json;

constexpr int kNewestVersion = 1;
const std::string kFormat = "kneeprint-plan";

/// The method whose harmonics the fit uses.
const std::string kFitted = "steady";

constexpr int kMostRungs = 400;
/// Converters run at up to 192 kHz; 90 kHz leaves room for their anti-alias filter.
constexpr Bounds kFrequency{0.0, 90000.0, true};
constexpr double kLongestWait = 86400.0;  // s: a day

/// A unit that levels are written in, and the levels that any rig could mean by it.
struct UnitRow {
  PlanUnit unit;
  const char* name;
  Bounds levels;
};
constexpr std::array<UnitRow, 4> kUnits{{
    {PlanUnit::dbfs, "dBFS", {-140.0, 0.0}},
    {PlanUnit::dbu, "dBu", {-120.0, 60.0}},
    {PlanUnit::dbv, "dBV", {-120.0, 60.0}},
    {PlanUnit::volts, "V", {1e-6, 1000.0}},  // as dBV
}};

const UnitRow& row_of(PlanUnit unit) {
  return *std::find_if(kUnits.begin(), kUnits.end(), [&](auto& r) { return r.unit == unit; });
}

PlanUnit read_unit(const JsonFields& fields) {
  std::vector<std::string> names;
  for (const UnitRow& row : kUnits) names.emplace_back(row.name);
  const std::string found = fields.choice("unit", "unit", names);
  return std::find_if(kUnits.begin(), kUnits.end(), [&](auto& r) { return found == r.name; })->unit;
}

PlanLevel read_level(const JsonFields& fields, const std::string& name, PlanUnit unit) {
  const double value = fields.number(name);
  const auto& [ignored, unit_name, bounds] = row_of(unit);
  if (value < bounds.least || value > bounds.most) {
    const bool negative_volts = unit == PlanUnit::volts && value < 0.0;
    fields.refuse(name, fmt::format("{} {} {}; expected {} to {} {}",
                                    negative_volts ? "negative level" : "level", value, unit_name,
                                    bounds.least, bounds.most, unit_name));
  }
  return {value, unit};
}

double span_db(const LadderPlan& ladder) {
  return ladder.from.unit == PlanUnit::volts
             ? Decibels::of_ratio(ladder.to.value / ladder.from.value).value()
             : ladder.to.value - ladder.from.value;
}

/// The allowance keeps 0.1 dB steps from missing a whole decibel by their rounding.
double rung_count(const LadderPlan& ladder) {
  constexpr double kRounding = 1e-9;
  return std::ceil(span_db(ladder) / ladder.step.value() - kRounding) + 1.0;
}

LadderPlan read_ladder(const JsonFields& fields) {
  fields.allow_only({"from", "to", "step_db", "unit"});
  const PlanUnit unit = read_unit(fields);
  LadderPlan ladder;
  ladder.from = read_level(fields, "from", unit);
  ladder.to = read_level(fields, "to", unit);
  ladder.step = Decibels(fields.number("step_db", {0.0, 200.0, true}));
  if (ladder.to.value < ladder.from.value) {
    fields.refuse(
        "to", fmt::format("level {} {} is below \"from\"; expected at least {} {}", ladder.to.value,
                          row_of(unit).name, ladder.from.value, row_of(unit).name));
  }
  if (rung_count(ladder) > kMostRungs) {
    fields.refuse("step_db", fmt::format("{} dB makes more than {} rungs; expected larger steps",
                                         ladder.step.value(), kMostRungs));
  }
  return ladder;
}

std::vector<Hertz> read_frequencies(const JsonFields& fields, const std::string& name) {
  std::vector<Hertz> out;
  for (const double hz : fields.numbers(name, kFrequency)) {
    if (std::find(out.begin(), out.end(), Hertz(hz)) != out.end()) {
      fields.refuse(name, fmt::format("{} Hz is listed twice; expected once", hz));
    }
    out.emplace_back(hz);
  }
  if (out.empty()) fields.refuse(name, "found []; expected at least one frequency");
  return out;
}

StepOptions read_options(const JsonFields& fields, const MethodNeeds& method) {
  StepOptions options;
  const auto given = [&](const std::string& name, bool allowed) {
    if (!fields.has(name)) return false;
    if (!allowed) {
      fields.refuse(
          name, fmt::format("method \"{}\" does not use it; expected no such field", method.id));
    }
    return true;
  };
  if (given("tones_hz", method.tones)) {
    options.tones = read_frequencies(fields, "tones_hz");
    if (options.tones.size() != 2) {
      fields.refuse("tones_hz",
                    fmt::format("found {} frequencies; expected two", options.tones.size()));
    }
    if (!(options.tones[0] < options.tones[1])) {
      fields.refuse("tones_hz", "expected the lower frequency first");
    }
  } else if (method.tones_required) {
    fields.refuse("tones_hz",
                  fmt::format("missing; method \"{}\" needs two frequencies", method.id));
  }
  if (given("ratio", method.ratio)) options.ratio = fields.number("ratio", {0.01, 100.0});
  if (given("duration_s", method.duration)) {
    options.duration = Seconds(fields.number("duration_s", {0.1, 120.0}));
  }
  if (given("listening_db_spl", method.listening)) {
    options.listening_db_spl = fields.number("listening_db_spl", {20.0, 120.0});
  }
  return options;
}

StepPlan read_step(const JsonFields& fields, const std::vector<MethodNeeds>& known_methods) {
  const std::string frequencies = "frequencies_hz";
  fields.allow_only(
      {"method", frequencies, "every", "tones_hz", "ratio", "duration_s", "listening_db_spl"});
  std::vector<std::string> ids;
  for (const MethodNeeds& m : known_methods) ids.push_back(m.id);
  StepPlan step;
  step.method = fields.choice("method", "method", ids);
  const MethodNeeds& method = *std::find_if(known_methods.begin(), known_methods.end(),
                                            [&](auto& m) { return m.id == step.method; });
  if (fields.has("every")) step.every = fields.integer("every", 1, kMostRungs);
  step.options = read_options(fields, method);
  if (method.frequencies) {
    step.frequencies = read_frequencies(fields, frequencies);
  } else if (fields.has(frequencies)) {
    fields.refuse(
        frequencies,
        fmt::format("method \"{}\" fixes its own tones; expected no such field", step.method));
  }
  return step;
}

bool play_the_same(const StepPlan& a, const StepPlan& b) {
  if (a.method != b.method || a.options != b.options) return false;
  return a.frequencies.empty() ||
         std::find_first_of(a.frequencies.begin(), a.frequencies.end(), b.frequencies.begin(),
                            b.frequencies.end()) != a.frequencies.end();
}

std::vector<StepPlan> read_steps(const JsonFields& plan,
                                 const std::vector<MethodNeeds>& known_methods) {
  std::vector<StepPlan> steps;
  for (const JsonFields& fields : plan.objects("steps")) {
    const StepPlan step = read_step(fields, known_methods);
    for (const StepPlan& earlier : steps) {
      if (play_the_same(earlier, step)) {
        fields.refuse("method", fmt::format("an earlier step plays the same take of \"{}\"; "
                                            "expected every take once",
                                            step.method));
      }
    }
    steps.push_back(step);
  }
  if (steps.empty()) plan.refuse("steps", "found []; expected at least one step");
  return steps;
}

Hertz read_fit_frequency(const JsonFields& fields, const std::vector<StepPlan>& steps) {
  const std::string name = "fit_frequency_hz";
  const double hz = fields.number(name, kFrequency);
  std::vector<std::string> choices;
  for (const StepPlan& step : steps) {
    if (step.method != kFitted) continue;
    for (const Hertz f : step.frequencies) {
      if (f.value() == hz) return f;
      choices.push_back(fmt::format("{}", f.value()));
    }
  }
  fields.refuse(
      name,
      choices.empty()
          ? fmt::format("found {}; expected a step of method \"{}\" that plays it", hz, kFitted)
          : fmt::format("found {}; expected a frequency of the steps: {}", hz, listed(choices)));
}

/// Leaves the default of a field that the file does not give.
void read_duration(const JsonFields& fields, const std::string& name, Bounds bounds, Seconds& out) {
  if (fields.has(name)) out = Seconds(fields.number(name, bounds));
}

void read_settings(const JsonFields& fields, Plan& plan) {
  if (fields.has("orders")) plan.orders = fields.integer("orders", 2, 20);
  read_duration(fields, "block_s", {0.1, 10.0}, plan.block);
  if (fields.has("blocks")) plan.blocks = fields.integer("blocks", 3, 1000);
  read_duration(fields, "longest_time_constant_s", {0.0, kLongestWait, true},
                plan.longest_time_constant);
  read_duration(fields, "settle_limit_s", {0.0, kLongestWait, true}, plan.settle_limit);
  read_duration(fields, "warm_up_s", {0.0, kLongestWait}, plan.warm_up);
  if (fields.has("wanted_uncertainty_db")) {
    plan.wanted_uncertainty = Decibels(fields.number("wanted_uncertainty_db", {0.0, 10.0, true}));
  }
  if (fields.has("wanted_harmonic_u_db")) {
    plan.wanted_harmonic_u = Decibels(fields.number("wanted_harmonic_u_db", {0.0, 20.0}));
  }
  if (fields.has("wanted_orders")) plan.wanted_orders = fields.integer("wanted_orders", 2, 20);
  if (fields.has("descend")) plan.descend = fields.boolean("descend");
  const Seconds averaged = plan.block * plan.blocks;
  constexpr double kRounding = 1e-12;  // 3 blocks of 0.1 s fit into 0.3 s
  if (plan.settle_limit < averaged * (1.0 - kRounding)) {
    fields.refuse(
        "settle_limit_s",
        fmt::format("{} s is shorter than {} blocks of {} s; expected at least {:g} s",
                    plan.settle_limit.value(), plan.blocks, plan.block.value(), averaged.value()));
  }
}

void read_ends(const JsonFields& fields, Plan& plan) {
  if (fields.has("stop")) {
    const JsonFields stop = fields.object("stop");
    stop.allow_only({"thd_f_percent", "compression_db"});
    if (stop.has("thd_f_percent")) {
      plan.stop_thd_f_percent = stop.number("thd_f_percent", {0.0, 1000.0, true});
    }
    if (stop.has("compression_db")) {
      plan.stop_compression = Decibels(stop.number("compression_db", {0.0, 100.0, true}));
    }
  }
  if (fields.has("ceiling")) {
    const JsonFields ceiling = fields.object("ceiling");
    ceiling.allow_only({"value", "unit"});
    plan.ceiling = read_level(ceiling, "value", read_unit(ceiling));
  }
}

/// Whole numbers without ".0", as a person writes them.
ordered_json number(double x) {
  constexpr double kExactIntegers = 9007199254740992.0;  // 2^53
  if (x == std::floor(x) && std::abs(x) < kExactIntegers) return static_cast<std::int64_t>(x);
  return x;
}

ordered_json json_of(const StepPlan& step) {
  ordered_json json{{"method", step.method}};
  for (const Hertz f : step.frequencies) json["frequencies_hz"].push_back(number(f.value()));
  if (step.every != 1) json["every"] = step.every;
  for (const Hertz f : step.options.tones) json["tones_hz"].push_back(number(f.value()));
  if (step.options.ratio) json["ratio"] = number(*step.options.ratio);
  if (step.options.duration) json["duration_s"] = number(step.options.duration->value());
  if (step.options.listening_db_spl) {
    json["listening_db_spl"] = number(*step.options.listening_db_spl);
  }
  return json;
}

}  // namespace

Plan parse_plan(const std::string& text, const std::string& origin,
                const std::vector<MethodNeeds>& known_methods) {
  const nlohmann::json json = parse_json(text, origin);
  const JsonFields fields(json, origin);
  if (fields.has("format") || fields.has("version")) fields.check_format(kFormat, kNewestVersion);
  fields.allow_only({"format", "version", "name", "ladder", "steps", "orders", "block_s", "blocks",
                     "longest_time_constant_s", "settle_limit_s", "warm_up_s",
                     "wanted_uncertainty_db", "wanted_harmonic_u_db", "wanted_orders", "descend",
                     "stop", "ceiling", "fit_frequency_hz"});
  Plan plan;
  plan.name = fields.text("name");
  if (plan.name.empty()) fields.refuse("name", "found \"\"; expected a name");
  plan.ladder = read_ladder(fields.object("ladder"));
  plan.steps = read_steps(fields, known_methods);
  read_settings(fields, plan);
  read_ends(fields, plan);
  if (fields.has("fit_frequency_hz")) plan.fit_frequency = read_fit_frequency(fields, plan.steps);
  return plan;
}

std::string plan_json(const Plan& plan) {
  const LadderPlan& ladder = plan.ladder;
  if (ladder.from.unit != ladder.to.unit) {
    throw std::invalid_argument("plan_json: the ladder's two ends have different units");
  }
  ordered_json json{
      {"format", kFormat},
      {"version", kNewestVersion},
      {"name", plan.name},
      {"ladder",
       {{"from", number(ladder.from.value)},
        {"to", number(ladder.to.value)},
        {"step_db", number(ladder.step.value())},
        {"unit", row_of(ladder.from.unit).name}}},
      {"steps", ordered_json::array()},
      {"orders", plan.orders},
      {"block_s", number(plan.block.value())},
      {"blocks", plan.blocks},
      {"longest_time_constant_s", number(plan.longest_time_constant.value())},
      {"settle_limit_s", number(plan.settle_limit.value())},
      {"warm_up_s", number(plan.warm_up.value())},
      {"wanted_uncertainty_db", number(plan.wanted_uncertainty.value())},
      {"wanted_harmonic_u_db", number(plan.wanted_harmonic_u.value())},
      {"wanted_orders", plan.wanted_orders},
      {"descend", plan.descend},
  };
  for (const StepPlan& step : plan.steps) json["steps"].push_back(json_of(step));
  if (plan.stop_thd_f_percent) json["stop"]["thd_f_percent"] = number(*plan.stop_thd_f_percent);
  if (plan.stop_compression) {
    json["stop"]["compression_db"] = number(plan.stop_compression->value());
  }
  if (plan.ceiling) {
    json["ceiling"] = {{"value", number(plan.ceiling->value)},
                       {"unit", row_of(plan.ceiling->unit).name}};
  }
  if (plan.fit_frequency) json["fit_frequency_hz"] = number(plan.fit_frequency->value());
  return json.dump(2) + "\n";
}

}  // namespace kneeprint
