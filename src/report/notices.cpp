// SPDX-License-Identifier: GPL-3.0-or-later
#include <fmt/format.h>

#include <algorithm>

#include "report/number_text.h"
#include "report/report_facts.h"
#include "report/report_sections.h"

namespace kneeprint {
namespace {

/// A stop that a person or a device caused, after which the run was taken up again.
bool was_resumed(const Journal& journal, const JournalStop& stop) {
  if (stop.reason != "cancelled" && stop.reason != "device") return false;
  return std::any_of(journal.takes.begin(), journal.takes.end(),
                     [&](const JournalTake& t) { return t.rung >= 0 && t.started > stop.at; });
}

/// The plan's own ends are no accident.
bool planned(const std::string& reason) {
  return reason == "thd" || reason == "compression" || reason == "ceiling";
}

void add_stops(const ReportData& data, std::vector<Block>& blocks) {
  std::vector<std::string> told;
  for (const auto& stop : data.journal.stops) {
    if (stop.reason == "top" || was_resumed(data.journal, stop)) continue;
    if (std::find(told.begin(), told.end(), stop.sentence) != told.end()) continue;
    told.push_back(stop.sentence);
    blocks.push_back(
        Notice{planned(stop.reason) ? "Ladder ended below its top." : "Ended early.",
               stop.sentence.empty() ? "Reason: " + stop.reason + "." : stop.sentence});
  }
}

std::size_t count_flag(const ReportData& data, Flag flag) {
  return static_cast<std::size_t>(
      std::count_if(data.curves.levels.begin(), data.curves.levels.end(),
                    [&](const LevelPoint& p) { return p.flag == flag; }));
}

}  // namespace

Section notices_section(const ReportData& data) {
  Section s;
  const auto add = [&](const char* title, const std::string& text) {
    s.blocks.push_back(Notice{title, text});
  };
  const Rig& rig = data.rig;
  if (rig.invented)
    add("Invented data.",
        "Everything here comes from a virtual unit behind virtual converters, not from a device.");
  if (rig.kind == RigKind::reel && !calibrated(rig))
    add("Uncalibrated reel.",
        "Drive is dBFS of the reel, output is relative to the lowest usable rung, and 'volts' are "
        "full scales; gain is not stated.");
  else if (!calibrated(rig))
    add("Uncalibrated.",
        "No full-scale voltage is known for this rig: levels are dBFS and 'volts' are full "
        "scales.");
  add_stops(data, s.blocks);
  if (data.model && data.model->frequency_dependent)
    add("Frequency-dependent.",
        "The unit bends differently at the frequencies measured, so one static curve cannot serve "
        "all of them: the two-tone prediction is shown, but it is not called a hold-out.");
  if (const FittedFamily* best = best_family(data)) {
    if (!best->describes())
      add("No family describes this unit.",
          "The best one misses more than half of its distortion, so its parameters say little "
          "about the "
          "unit; the measured curves stand for themselves.");
    else if (best->extrapolated)
      add("Limit extrapolated.",
          fmt::format(
              "The output reached {} % of the fitted limit: the limit is what the {} family makes "
              "of the bend seen so far. The families not rejected spread from {} to {} {}.",
              fixed_text(100.0 * best->reach, 0), best->family->title,
              short_text(data.model->fit.limit_low, 3), short_text(data.model->fit.limit_high, 3),
              data.model->axis_unit));
  }
  if (data.model && data.model->polarity < 0)
    add("Inverting unit.", "The unit inverts; its curve and phases are given upright.");
  if (!data.model && !data.why_no_model.empty()) add("No curve fitted.", data.why_no_model);
  if (!rig.dc_coupled_return)
    add("No DC.",
        "The return is AC-coupled: this interface cannot see DC: use a meter. The offset is left "
        "out of the fit.");
  if (!rig.floor.known())
    add("Rig floor unknown.",
        "What the rig adds by itself has not been measured; some of the distortion shown may be "
        "its own.");
  if (const auto n = count_flag(data, Flag::clipped))
    add("Rig clipped.",
        fmt::format(
            "At {} level{} the rig, not the unit, clipped; they are flagged and not fitted.", n,
            n == 1 ? "" : "s"));
  if (const auto n = count_flag(data, Flag::unsteady))
    add("Unsteady.", fmt::format("At {} level{} the unit had not settled within the plan's time.",
                                 n, n == 1 ? "" : "s"));
  return s;
}

}  // namespace kneeprint
