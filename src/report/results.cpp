// SPDX-License-Identifier: GPL-3.0-or-later
#include <fmt/format.h>

#include <algorithm>
#include <cmath>

#include "curve/crossing.h"
#include "report/number_text.h"
#include "report/report_facts.h"
#include "report/report_sections.h"

namespace kneeprint {
namespace {

constexpr const char* kNever = "not reached";

/// What a table says where nothing crosses the line.
std::string no_crossing_text(const std::vector<LevelPoint>& levels, double percent) {
  bool any = false, above = true;
  for (const auto& p : levels) {
    if (p.flag != Flag::none || !p.thd_f_percent) continue;
    any = true;
    above = above && *p.thd_f_percent >= percent;
  }
  return !any ? kDash : above ? "above throughout" : kNever;
}

std::string crossings_text(const std::vector<LevelPoint>& levels, double hz, double percent) {
  std::string text;
  for (const auto& c : thd_crossings(levels, hz, percent))
    text +=
        fmt::format("{}{} {}", text.empty() ? "" : "; ",
                    c.direction == Direction::up ? "up" : "down", with_u(c.drive, c.expanded_u_db));
  return text.empty() ? no_crossing_text(at_frequency(levels, hz), percent) : text;
}

}  // namespace

Section summary_section(const ReportData& data) {
  const auto& levels = data.curves.levels;
  const auto frequencies = frequencies_of(levels);
  if (frequencies.empty()) return {};
  const std::string unit = drive_unit(data);

  Table thd;
  thd.caption = fmt::format(
      "Drive, {}, at which THD_F passes a value, with its direction as the drive rises. ± at 95 %, "
      "with what a straight line in log percent between rungs may miss.",
      unit);
  thd.heads = {"frequency"};
  for (double percent : kThdMarks) thd.heads.push_back(short_text(percent) + " %");
  thd.heads.push_back("highest THD_F, %");
  for (double hz : frequencies) {
    std::vector<std::string> row{frequency_text(hz)};
    for (double percent : kThdMarks) row.push_back(crossings_text(levels, hz, percent));
    const LevelPoint* highest = nullptr;
    for (const auto& p : levels)
      if (p.frequency_hz == hz && p.flag == Flag::none && p.thd_f_percent &&
          (!highest || *p.thd_f_percent > *highest->thd_f_percent))
        highest = &p;
    row.push_back(highest ? with_u(highest->thd_f_percent, highest->thd_f_u_percent, 3) : kDash);
    thd.rows.push_back(row);
  }

  Table compression;
  compression.caption = fmt::format(
      "Drive, {}, at which the gain has fallen against that of the reference rung; ± at 95 %.",
      unit);
  compression.heads = {"frequency", "reference rung"};
  for (double drop : kCompressionMarks)
    compression.heads.push_back(short_text(drop) + " dB of compression");
  compression.heads.push_back("gain at the top");
  for (double hz : frequencies) {
    const auto gain = relative_gain(data.curves, hz);
    std::vector<std::string> row{frequency_text(hz),
                                 gain.empty() ? kDash : fixed_text(gain[0].drive, 2)};
    for (double drop : kCompressionMarks) {
      const auto c = compression_point(gain, Decibels(drop));
      row.push_back(c ? with_u(c->drive, c->expanded_u_db) : gain.empty() ? kDash : kNever);
    }
    row.push_back(gain.empty() ? kDash : fixed_text(gain.back().db, 2) + " dB");
    compression.rows.push_back(row);
  }
  return {"In figures", {thd, compression}};
}

Section figures_section(const ReportData& data) {
  Section s{"Curves", {}};
  for (auto& f : report_figures(data)) s.blocks.emplace_back(std::move(f));
  if (s.blocks.empty()) s.blocks.push_back(Paragraph{"Nothing could be drawn: no usable points."});
  return s;
}

namespace {

std::string level_cell(const Cell& value, const Cell& u) { return with_u(value, u, 2); }

}  // namespace

Section levels_section(const ReportData& data) {
  Section s{"Every level", {}};
  s.collapsed = s.on_screen_only = true;
  Table t;
  const std::string unit = drive_unit(data);
  const bool reel = data.rig.kind == RigKind::reel && !calibrated(data.rig);
  const std::string volts = calibrated(data.rig) ? "V" : "FS";
  t.caption =
      "Steady sine, every rung. ± at 95 %. An empty figure was not measured, or cannot be on this "
      "rig. The harmonics themselves stand in curves/harmonics.csv, the two-tone products in "
      "curves/intermod.csv.";
  t.heads = {"frequency, Hz",  "drive, " + unit, reel ? "output, dB" : "output, " + unit,
             "gain, dB",       "THD_F, %",       "THD_R, %",
             "orders to",      "THD+N, %",       "SINAD, dB",
             "noise, " + unit, "even/odd, dB",   "DC, " + volts,
             "blocks",         "settled, s",     "flag"};
  for (double hz : frequencies_of(data.curves.levels))
    for (const auto& p : at_frequency(data.curves.levels, hz)) {
      // A THD under the noise is an upper limit.
      const bool limit = p.flag == Flag::noise && p.thd_f_percent;
      const auto thd = [&](const Cell& v, const Cell& u) {
        return limit && v ? "< " + short_text(*v, 2) : with_u(v, u, 3);
      };
      t.rows.push_back(
          {short_text(p.frequency_hz, 6), fixed_text(p.drive, 2),
           level_cell(p.output, p.output_u_db), level_cell(p.gain_db, p.gain_u_db),
           thd(p.thd_f_percent, p.thd_f_u_percent), thd(p.thd_r_percent, p.thd_r_u_percent),
           p.thd_orders > 0 ? fmt::format("H{}", p.thd_orders) : kDash,
           with_u(p.thdn_percent, p.thdn_u_percent, 3), level_cell(p.sinad_db, p.sinad_u_db),
           level_cell(p.noise, p.noise_u_db), level_cell(p.even_odd_db, p.even_odd_u_db),
           with_u(p.dc, p.dc_u, 5), std::to_string(p.blocks), short_text(p.settled_after_s, 3),
           p.flag == Flag::none ? "" : std::string(name(p.flag))});
    }
  if (!t.rows.empty()) s.blocks.push_back(t);
  return s;
}

}  // namespace kneeprint
