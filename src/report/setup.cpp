// SPDX-License-Identifier: GPL-3.0-or-later
#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <cmath>
#include <map>
#include <set>

#include "quantity/uncertain.h"
#include "report/number_text.h"
#include "report/report_facts.h"
#include "report/report_sections.h"

namespace kneeprint {
namespace {

constexpr const char* kNotStated = "not stated";

std::string unit_text(PlanUnit unit) {
  switch (unit) {
    case PlanUnit::dbfs:
      return "dBFS";
    case PlanUnit::dbu:
      return "dBu";
    case PlanUnit::dbv:
      return "dBV";
    case PlanUnit::volts:
      return "V rms";
  }
  return "";
}

std::string level_text(const PlanLevel& level) {
  return short_text(level.value) + " " + unit_text(level.unit);
}

/// A method's title with the tones that the plan gives it, each once.
std::string methods_text(const ReportData& data) {
  std::vector<std::string> titles;
  for (const StepPlan& step : data.plan.steps) {
    const auto known = data.method_titles.find(step.method);
    std::string title = known == data.method_titles.end() ? step.method : known->second;
    if (!step.options.tones.empty()) {
      title += fmt::format(" ({} and {})", frequency_text(step.options.tones[0].value()),
                           frequency_text(step.options.tones[1].value()));
    }
    if (step.every > 1) title += fmt::format(", at every {}th rung", step.every);
    titles.push_back(std::move(title));
  }
  return titles.empty() ? "none" : fmt::format("{}", fmt::join(titles, "; "));
}

std::string full_scale_text(const LevelScale& scale) {
  if (!scale.is_calibrated()) return "not stated (uncalibrated)";
  const double u = 1.959964 * scale.standard_uncertainty.value();  // 0.975 quantile of the normal
  const double volts = to_volts(LevelDbu(scale.offset_db)).value();
  return fmt::format("{} dBu ({} V rms of a full-scale sine){}", fixed_text(scale.offset_db, 2),
                     short_text(volts), u > 0.0 ? fmt::format(" ± {} dB", fixed_text(u, 3)) : "");
}

/// Asked and played frequency, and how far apart.
std::string frequencies_text(const ReportData& data) {
  std::map<double, double> played;  // asked -> played
  for (const auto& p : data.curves.levels)
    played.emplace(p.asked_hz > 0.0 ? p.asked_hz : p.frequency_hz, p.frequency_hz);
  std::string text;
  for (const auto& [asked, hz] : played) {
    const double shift = 100.0 * (hz / asked - 1.0);
    text +=
        fmt::format("{}{} Hz ({})", text.empty() ? "" : "; ", short_text(asked, 6),
                    std::abs(shift) < 5e-5 ? "played as asked"
                                           : fmt::format("played at {} Hz, shift {}\u00a0%",
                                                         short_text(hz, 7), fixed_text(shift, 4)));
  }
  return text.empty() ? "none" : text;
}

std::string ladder_text(const ReportData& data) {
  const auto& ladder = data.plan.ladder;
  std::set<int> rungs;
  for (const auto& t : data.journal.takes)
    if (t.rung >= 0) rungs.insert(t.rung);
  return fmt::format("{} to {} in steps of {} dB, ascending; {} rung{} played",
                     level_text(ladder.from), level_text(ladder.to),
                     short_text(ladder.step.value()), rungs.size(), rungs.size() == 1 ? "" : "s");
}

std::string blocks_text(const ReportData& data) {
  int least = 0, most = 0;
  for (const auto& p : data.curves.levels) {
    if (p.blocks <= 0) continue;
    least = least == 0 ? p.blocks : std::min(least, p.blocks);
    most = std::max(most, p.blocks);
  }
  std::string text =
      fmt::format("{} s asked, lengthened to whole cycles; ", short_text(data.plan.block.value()));
  if (most == 0) return text + fmt::format("{} averaged as planned", data.plan.blocks);
  return text + (least == most ? fmt::format("{} averaged", most)
                               : fmt::format("{} to {} averaged", least, most));
}

std::string takes_text(const Journal& journal) {
  std::size_t repeated = 0, count = 0;
  for (const auto& t : journal.takes) {
    count += t.rung >= 0;
    repeated += t.attempts > 1;
  }
  return fmt::format("{}, {} of them repeated after dropouts", count,
                     repeated == 0 ? "none" : std::to_string(repeated));
}

/// How the seconds of sound were spent. Integration is what the averages used.
std::string seconds_text(const Journal& journal) {
  double integration = 0, settling = 0, ramps = 0, gaps = 0, again = 0;
  for (const JournalTake& t : journal.takes) {
    if (t.rung < 0 || t.sound_s <= 0.0) continue;
    integration += t.read_s - t.settling_s;
    settling += t.settling_s;
    ramps += t.sound_s - t.read_s;
    gaps += t.tail_s;
    again += t.discarded_s + (t.attempts - 1) * t.sound_s;
  }
  const double all = integration + settling + ramps + gaps + again;
  if (!(all > 0.0)) return "not stated";
  const auto share = [&](const char* what, double seconds) {
    return fmt::format("{} {} %", what, fixed_text(100.0 * seconds / all, 1));
  };
  return fmt::format("{} s: {}, {}, {}, {}, {}", fixed_text(all, 0),
                     share("integration", integration), share("settling", settling),
                     share("ramps and margins", ramps), share("gaps for the rig's delay", gaps),
                     share("plays made again for longer holds or after losses", again));
}

std::string ends_text(const Plan& plan) {
  std::string text = "at its top";
  if (plan.stop_thd_f_percent)
    text += fmt::format(", at THD_F {} %", short_text(*plan.stop_thd_f_percent));
  if (plan.stop_compression)
    text += fmt::format(", at {} dB of compression", short_text(plan.stop_compression->value()));
  if (plan.ceiling) text += ", at the ceiling of " + level_text(*plan.ceiling);
  return text + ", or where the guard stops it";
}

std::string or_not_stated(const std::string& text) { return text.empty() ? kNotStated : text; }
std::string ohms_text(const std::optional<Ohms>& z) {
  return z ? short_text(z->value()) + " Ω" : kNotStated;
}

std::string reference_text(const Rig& rig) {
  if (!rig.reference_channel) return "none: the drive is what was sent";
  const std::string tap = rig.reference_tap == "terminals" ? ", split at the unit's input terminals"
                          : rig.reference_tap == "second-output" ? ", from a second output"
                                                                 : "";
  return fmt::format("return {}{}", *rig.reference_channel, tap);
}

std::string kind_text(RigKind kind) {
  switch (kind) {
    case RigKind::virtual_rig:
      return "virtual rig";
    case RigKind::live:
      return "live rig";
    case RigKind::reel:
      return "reel";
  }
  return "";
}

}  // namespace

Section setup_section(const ReportData& data) {
  const Plan& plan = data.plan;
  const Rig& rig = data.rig;
  Definitions d;
  const auto add = [&](const char* term, const std::string& text) {
    d.entries.emplace_back(term, text);
  };
  add("unit", unit_name(data));
  add("rig", fmt::format("{} ({})", or_not_stated(rig.name), kind_text(rig.kind)));
  if (!rig.device.empty()) add("device", rig.device);
  add("plan", or_not_stated(plan.name));
  add("methods", methods_text(data));
  add("ladder", ladder_text(data));
  add("ladder ends", ends_text(plan));
  add("frequencies asked", frequencies_text(data));
  add("harmonics read", fmt::format("H1 to H{}", plan.orders));
  add("blocks", blocks_text(data));
  add("ramps", "raised cosine, at least 20 ms and 4 periods of the lowest tone");
  add("settling", fmt::format("the remaining change of a fitted exponential below {} dB; time "
                              "constants to {} s, at most {} s a take",
                              short_text(plan.wanted_uncertainty.value()),
                              short_text(plan.longest_time_constant.value()),
                              short_text(plan.settle_limit.value())));
  add("takes", takes_text(data.journal));
  add("seconds of sound", seconds_text(data.journal));
  add("source impedance", ohms_text(rig.source_impedance));
  add("load", ohms_text(rig.load_impedance));
  add("wiring", or_not_stated(rig.wiring));
  add("reference", reference_text(rig));
  add("send full scale", full_scale_text(rig.send_scale));
  add("return full scale", full_scale_text(rig.return_scale));
  add("calibrated on", or_not_stated(rig.calibrated_on));
  add("coupling", fmt::format("send {}, return {}", rig.dc_coupled_send ? "DC" : "AC",
                              rig.dc_coupled_return ? "DC" : "AC"));
  add("sample rate", short_text(rig.rate.value(), 7) + " Hz");
  add("seed", std::to_string(data.journal.begin.seed));
  add("started", or_not_stated(data.journal.begin.started));
  add("program", or_not_stated(data.journal.begin.program));
  return {"What was measured and how", {d}};
}

}  // namespace kneeprint
