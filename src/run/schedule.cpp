// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/schedule.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "quantity/failure.h"

namespace kneeprint {
namespace {

TakeSettings settings_of(const Plan& plan) {
  return {plan.orders, plan.block, plan.blocks, plan.longest_time_constant,
          plan.wanted_uncertainty};
}

}  // namespace

RigView view_of(const Rig& rig) {
  RigView view;
  if (rig.send_scale.is_calibrated() && rig.return_scale.is_calibrated()) {
    view.send = rig.send_scale;
    view.ret = rig.return_scale;
  }
  view.floor = rig.floor;
  view.sees_dc = rig.dc_coupled_return;
  view.gain_known = rig.kind != RigKind::reel || view.send.is_calibrated();
  view.recorded_rate = rig.recorded_rate;
  return view;
}

LevelDbfs send_level(const PlanLevel& level, const Rig& rig, const std::string& field) {
  const RigView view = view_of(rig);
  double dbfs = level.value;
  if (level.unit != PlanUnit::dbfs) {
    if (!view.send.is_calibrated()) {
      throw InputError(
          fmt::format("plan: field \"{}\" is in volts, dBu or dBV, but this rig is uncalibrated: "
                      "give a rig file "
                      "with full-scale voltages (--rig FILE), or state the level in dBFS",
                      field));
    }
    double dbu = level.value;
    if (level.unit == PlanUnit::dbv) dbu = to_dbu(to_volts(LevelDbv(level.value))).value();
    if (level.unit == PlanUnit::volts) dbu = to_dbu(VoltsRms(level.value)).value();
    dbfs = view.send.dbfs_of(dbu).value();
  }
  return LevelDbfs(dbfs);
}

LevelDbfs ceiling_of(const Plan& plan, const Rig& rig, std::optional<LevelDbfs> asked,
                     bool has_rig_file) {
  constexpr LevelDbfs kUnknownLive{-20.0};
  LevelDbfs ceiling(0.0);
  bool named = false;
  const auto lower = [&](LevelDbfs l) {
    ceiling = std::min(ceiling, l);
    named = true;
  };
  if (asked) lower(*asked);
  if (plan.ceiling) lower(send_level(*plan.ceiling, rig, "ceiling"));
  if (rig.ceiling_dbfs) lower(LevelDbfs(*rig.ceiling_dbfs));
  // Only a ceiling named on the command line lifts this one: a plan written for another rig must
  // not.
  if (rig.kind == RigKind::live && !has_rig_file && !asked) {
    ceiling = named ? std::min(ceiling, kUnknownLive) : kUnknownLive;
  }
  return ceiling;
}

Ladder ladder_of(const Plan& plan, const Rig& rig, LevelDbfs ceiling) {
  constexpr double kRounding = 1e-9;
  const double from = send_level(plan.ladder.from, rig, "ladder.from").value();
  const double to = send_level(plan.ladder.to, rig, "ladder.to").value();
  std::vector<LevelDbfs> all;
  for (int k = 0; from + k * plan.ladder.step.value() < to - kRounding; ++k) {
    all.emplace_back(from + k * plan.ladder.step.value());
  }
  all.emplace_back(to);
  Ladder ladder;
  for (const LevelDbfs level : all) {
    if (level.value() <= ceiling.value() + kRounding) {
      ladder.rungs.push_back(std::min(level, ceiling));
    } else {
      ladder.cut_by_ceiling = true;
    }
  }
  if (ladder.rungs.empty()) {
    throw InputError(
        fmt::format("plan: the ladder's lowest rung, {:.2f} dBFS at the send, is above the ceiling "
                    "of {:.2f} dBFS; "
                    "lower ladder.from, or raise the ceiling by name (--ceiling)",
                    from, ceiling.value()));
  }
  return ladder;
}

std::vector<TakeSpec> takes_of_rung(const Plan& plan, const Rig& rig, LevelDbfs send, int rung) {
  std::vector<TakeSpec> takes;
  const auto add = [&](const std::string& method, Hertz asked) {
    TakeSpec spec{method, asked, send, rung, 0, settings_of(plan)};
    spec.hold_blocks = find_method(method)->first_hold_blocks(spec, rig.rate);
    takes.push_back(spec);
  };
  for (const StepPlan& step : plan.steps) {
    if (step.frequencies.empty()) add(step.method, Hertz(0.0));
    for (const Hertz f : step.frequencies) add(step.method, f);
  }
  return takes;
}

int takes_per_rung(const Plan& plan) {
  int count = 0;
  for (const StepPlan& step : plan.steps) {
    count += std::max(1, static_cast<int>(step.frequencies.size()));
  }
  return count;
}

int take_number(const Plan& plan, int rung, int index) {
  return 1 + rung * takes_per_rung(plan) + index;
}

double fit_frequency(const Plan& plan) {
  if (plan.fit_frequency) return plan.fit_frequency->value();
  double best = 0.0;
  for (const StepPlan& step : plan.steps) {
    for (const Hertz f : step.frequencies) {
      const auto octaves = [](double g) { return std::abs(std::log2(g / 997.0)); };
      if (best == 0.0 || octaves(f.value()) < octaves(best)) best = f.value();
    }
  }
  return best;
}

void check_rate(const Plan& plan, Hertz rate) {
  constexpr double kHighestTone = 0.4535;  // what a converter's half-band filter passes
  const double top = kHighestTone * rate.value();
  for (const StepPlan& step : plan.steps) {
    for (const Hertz f : step.frequencies) {
      if (f.value() > top) {
        throw InputError(fmt::format(
            "plan: {} Hz cannot be played at a sample rate of {} Hz (at most {:.0f} Hz): lower the "
            "frequency or raise the rate",
            f.value(), rate.value(), top));
      }
    }
    // Two-tone methods go up to 20 kHz, which every usual rate from 44.1 kHz carries.
    if (step.frequencies.empty() && rate.value() < 44100.0) {
      throw InputError(fmt::format(
          "plan: method \"{}\" needs a sample rate of at least 44100 Hz; this rig runs at {} Hz",
          step.method, rate.value()));
    }
  }
}

}  // namespace kneeprint
