// SPDX-License-Identifier: GPL-3.0-or-later
#include "report/report_facts.h"

#include <algorithm>
#include <cmath>

#include "curve/crossing.h"
#include "figure/utf8.h"

namespace kneeprint {

std::string unit_name(const ReportData& data) {
  const std::string text = printable_utf8(data.journal.begin.unit);
  return text.find_first_not_of(' ') == std::string::npos ? "unnamed unit" : text;
}

std::string unit_label(const ReportData& data) {
  constexpr std::size_t kMost = 60;
  const auto letters = split_letters(unit_name(data));
  std::string label;
  for (std::size_t i = 0; i < std::min(letters.size(), kMost); ++i) label += letters[i];
  return letters.size() > kMost ? label + "\u2026" : label;
}

std::string drive_unit(const ReportData& data) {
  if (!data.curves.levels.empty()) return std::string(name(data.curves.levels.front().unit));
  if (!data.curves.intermods.empty()) return std::string(name(data.curves.intermods.front().unit));
  return std::string(name(data.rig.send_scale.unit));
}

std::string rig_line(const Rig& rig) {
  std::string line = rig.kind == RigKind::virtual_rig ? "virtual rig"
                     : rig.kind == RigKind::reel      ? "reel"
                                                      : "live rig";
  if (rig.invented) line += ", invented data";
  if (!calibrated(rig)) line += ", uncalibrated";
  return line;
}

std::string conditions_line(const ReportData& data) {
  return unit_label(data) + " · " + rig_line(data.rig);
}

double fit_frequency(const ReportData& data) {
  const double wanted = data.model                ? data.model->fit_frequency_hz
                        : data.plan.fit_frequency ? data.plan.fit_frequency->value()
                                                  : 997.0;
  double nearest = 0.0;
  for (double hz : frequencies_of(data.curves.levels))
    if (nearest == 0.0 || std::abs(std::log(hz / wanted)) < std::abs(std::log(nearest / wanted)))
      nearest = hz;
  return nearest;
}

bool calibrated(const Rig& rig) {
  return rig.send_scale.is_calibrated() && rig.return_scale.is_calibrated();
}

const FittedFamily* best_family(const ReportData& data) {
  if (!data.model || data.model->fit.best >= data.model->fit.families.size()) return nullptr;
  return &data.model->fit.families[data.model->fit.best];
}

const HoldoutFamily* best_holdout(const ReportData& data) {
  const FittedFamily* best = best_family(data);
  if (!best) return nullptr;
  for (const auto& h : data.model->holdout)
    if (h.family == best->family->id) return &h;
  return nullptr;
}

}  // namespace kneeprint
