// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/schedule.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <vector>

#include "method/reading.h"
#include "quantity/failure.h"

namespace kneeprint {
namespace {

TakeSettings settings_of(const Plan& plan) {
  return {plan.orders,
          plan.block,
          plan.blocks,
          plan.longest_time_constant,
          plan.wanted_uncertainty,
          plan.wanted_harmonic_u,
          plan.wanted_orders};
}

/// One take for every step and frequency, in the plan's order.
struct Slot {
  const StepPlan* step;
  const Method* method;
  Hertz asked{0.0};
};

std::vector<Slot> slots_of(const Plan& plan, Placement placement) {
  std::vector<Slot> slots;
  for (const StepPlan& step : plan.steps) {
    const Method* method = find_method(step.method);
    if (method->placement != placement) continue;
    if (step.frequencies.empty()) slots.push_back({&step, method, Hertz(0.0)});
    for (const Hertz f : step.frequencies) slots.push_back({&step, method, f});
  }
  return slots;
}

int count_of(const Plan& plan, Placement placement) {
  return static_cast<int>(slots_of(plan, placement).size());
}

TakeSpec spec_of_slot(const Slot& slot, const Plan& plan, const Rig& rig, LevelDbfs send,
                      int rung) {
  TakeSpec spec;
  spec.method = slot.step->method;
  spec.asked = slot.asked;
  spec.send = send;
  spec.rung = rung;
  spec.settings = settings_of(plan);
  spec.options = slot.step->options;
  spec.lowest = std::min(send, send_level(plan.ladder.from, rig, "ladder.from"));
  spec.hold_blocks = slot.method->first_hold_blocks(spec, rig.rate);
  return spec;
}

bool is_taken_down(const Slot& slot) { return slot.step->method == "steady"; }

int aside_base(const Plan& plan, Placement placement) {
  return placement == Placement::before_ladder ? 1 : 1 + count_of(plan, Placement::before_ladder);
}

int rung_base(const Plan& plan, int rung, bool down) {
  const int each = count_of(plan, Placement::every_rung);
  const int asides =
      count_of(plan, Placement::before_ladder) + count_of(plan, Placement::after_ladder);
  return 1 + asides + rung * each * (plan.descend ? 2 : 1) + (down ? each : 0);
}

}  // namespace

RigView view_of(const Rig& rig) {
  RigView view;
  if (rig.send_scale.is_calibrated() && rig.return_scale.is_calibrated()) {
    view.send = rig.send_scale;
    view.ret = rig.return_scale;
  }
  view.floor = rig.floor;
  view.response = rig.response;
  view.sees_dc = rig.dc_coupled_return;
  view.gain_known = rig.kind != RigKind::reel || view.send.is_calibrated();
  view.recorded_rate = rig.recorded_rate;
  view.drifting_clock = rig.kind == RigKind::reel;
  view.marker_polarity = rig.marker_polarity;
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

std::vector<TakeSpec> takes_of_rung(const Plan& plan, const Rig& rig, LevelDbfs send, int rung,
                                    bool down) {
  std::vector<TakeSpec> takes;
  int number = rung_base(plan, rung, down) - 1;
  for (const Slot& slot : slots_of(plan, Placement::every_rung)) {
    ++number;
    if (rung % slot.step->every != 0 || (down && !is_taken_down(slot))) continue;
    takes.push_back(spec_of_slot(slot, plan, rig, send, rung));
    takes.back().number = number;
    takes.back().down = down;
  }
  return takes;
}

std::vector<TakeSpec> takes_aside(const Plan& plan, const Rig& rig, Placement placement,
                                  LevelDbfs send, int rung) {
  std::vector<TakeSpec> takes;
  int number = aside_base(plan, placement);
  for (const Slot& slot : slots_of(plan, placement)) {
    takes.push_back(spec_of_slot(slot, plan, rig, send, rung));
    takes.back().number = number++;
  }
  return takes;
}

std::optional<TakeSpec> take_by_number(const Plan& plan, const Rig& rig, int number, LevelDbfs send,
                                       int rung) {
  const auto among = [&](int base, Placement placement) -> std::optional<TakeSpec> {
    const std::vector<Slot> slots = slots_of(plan, placement);
    const int index = number - base;
    if (index < 0 || index >= static_cast<int>(slots.size())) return std::nullopt;
    TakeSpec spec = spec_of_slot(slots[static_cast<std::size_t>(index)], plan, rig, send, rung);
    spec.number = number;
    return spec;
  };
  for (const Placement aside : {Placement::before_ladder, Placement::after_ladder}) {
    if (auto spec = among(aside_base(plan, aside), aside)) return spec;
  }
  for (const bool down : {false, true}) {
    if (down && !plan.descend) break;
    if (auto spec = among(rung_base(plan, rung, down), Placement::every_rung)) {
      spec->down = down;
      return spec;
    }
  }
  return std::nullopt;
}

double fit_frequency(const Plan& plan) {
  if (plan.fit_frequency) return plan.fit_frequency->value();
  double best = 0.0;
  for (const StepPlan& step : plan.steps) {
    if (step.method != "steady") continue;
    for (const Hertz f : step.frequencies) {
      const auto octaves = [](double g) { return std::abs(std::log2(g / 997.0)); };
      if (best == 0.0 || octaves(f.value()) < octaves(best)) best = f.value();
    }
  }
  return best;
}

void check_rate(const Plan& plan, Hertz rate) {
  constexpr double kRounding = 1.0 + 1e-9;
  const double top = kConverterShare * rate.value();
  for (const StepPlan& step : plan.steps) {
    if (const auto check = find_method(step.method)->check) check(step.options, rate);
    for (const Hertz f : step.frequencies) {
      if (f.value() > top * kRounding) {
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
