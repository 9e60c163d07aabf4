// SPDX-License-Identifier: GPL-3.0-or-later
// What is asked of a measurement: plan.json and the built-in plans.
#pragma once

#include <filesystem>
#include <optional>
#include <string>
#include <vector>

#include "curve/step_options.h"
#include "quantity/level.h"

namespace kneeprint {

/// Units a plan may state levels in. Volts are rms.
enum class PlanUnit { dbfs, dbu, dbv, volts };

struct PlanLevel {
  double value = 0.0;
  PlanUnit unit = PlanUnit::dbfs;
};

struct LadderPlan {
  PlanLevel from{-60.0, PlanUnit::dbfs};
  PlanLevel to{0.0, PlanUnit::dbfs};  ///< same unit as from, and not below it
  Decibels step{3.0};                 ///< > 0; the top rung is `to` itself even off the grid
};

struct StepPlan {
  std::string method;              ///< registry id: "steady", "smpte", "ccif", ...
  std::vector<Hertz> frequencies;  ///< one take each; methods that fix their tones: empty
  int every = 1;                   ///< played at every so many-th rung, counted from the lowest
  StepOptions options{};
};

struct Plan {
  std::string name;
  LadderPlan ladder;
  std::vector<StepPlan> steps;
  int orders = 10;     ///< highest harmonic read, 2 .. 20
  Seconds block{0.5};  ///< wanted, 0.1 .. 10 s; lengthened where whole cycles need it
  int blocks = 4;      ///< averaged when settled, 3 .. 1000
  Seconds longest_time_constant{0.5};  ///< of the unit: the settling fit looks no further
  /// Longest hold of one take, then the point is `unsteady`. At least all the blocks.
  Seconds settle_limit{4.0};
  Seconds warm_up{0.0};  ///< idle time before the first take on a live rig
  Decibels wanted_uncertainty{0.01};
  /// Expanded uncertainty wanted of harmonics 2 .. wanted_orders; a take is held longer, up to
  /// settle_limit, until it is reached. 0: not asked for.
  Decibels wanted_harmonic_u{0.0};
  int wanted_orders = 5;
  bool descend = false;  ///< after the top, the steady steps again on the way down
  std::optional<double> stop_thd_f_percent;  ///< the ladder ends after the rung that reaches it
  std::optional<Decibels> stop_compression;  ///< same, against the lowest usable rung
  std::optional<PlanLevel> ceiling;          ///< a rung above it is not played
  /// The steady frequency that the fit uses, one of the steps'; by default the nearest to 997 Hz.
  std::optional<Hertz> fit_frequency;
};

/// "glance", "portrait", "atlas".
std::vector<std::string> built_in_plans();
/// A built-in name, else a file. Throws InputError: no such plan (lists the built-in names), not
/// JSON (line and column), an unknown or missing field, a wrong type, a negative or impossible
/// value; names file, field, what was found and what was expected. Steps are checked against
/// `known_methods`.
Plan load_plan(const std::string& name_or_file, const std::vector<MethodNeeds>& known_methods);
Plan parse_plan(const std::string& json, const std::string& origin,
                const std::vector<MethodNeeds>& known_methods);
/// Canonical text: equal plans give equal bytes.
std::string plan_json(const Plan& plan);

}  // namespace kneeprint
