// SPDX-License-Identifier: GPL-3.0-or-later
#include "report/method_figures.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <limits>
#include <map>
#include <set>

#include "report/number_text.h"
#include "report/report_facts.h"

namespace kneeprint {
namespace {

constexpr int kHighestOrder = 3;        ///< of the swept figures: more would hide one another
constexpr std::size_t kMostDrives = 5;  ///< lines of one figure

/// Lifts the pen: no line is drawn across what stands under the noise.
FigurePoint gap_at(double x) {
  FigurePoint p;
  p.x = x;
  p.y = std::numeric_limits<double>::quiet_NaN();
  return p;
}

/// A line of which less than half stands above the noise would show chance finds.
bool is_mostly_seen(const Series& s) {
  const auto seen = std::count_if(s.points.begin(), s.points.end(),
                                  [](const FigurePoint& p) { return std::isfinite(p.y); });
  return 2 * seen >= static_cast<long>(s.points.size()) && seen > 1;
}

FigurePoint point_of(double x, double y, const Cell& u, Flag flag) {
  FigurePoint p;
  p.x = x;
  p.y = y;
  p.upper_limit = flag == Flag::noise;
  p.doubtful = flag != Flag::none && flag != Flag::noise;
  if (u && !p.upper_limit) {
    p.low = y - *u;
    p.high = y + *u;
  }
  return p;
}

/// At most kMostDrives of them, evenly spread, the highest among them.
std::vector<double> spread_out(const std::set<double>& all) {
  const std::vector<double> drives(all.begin(), all.end());
  if (drives.size() <= kMostDrives) return drives;
  std::vector<double> some;
  for (std::size_t i = 0; i < kMostDrives; ++i) {
    some.push_back(drives[i * (drives.size() - 1) / (kMostDrives - 1)]);
  }
  return some;
}

std::string at_drive(const ReportData& data, double drive) {
  return fmt::format("{} {}", fixed_text(drive, 1), drive_unit(data));
}

Figure swept_figure(const ReportData& data, int order) {
  Figure f;
  f.id = fmt::format("response-h{}", order);
  f.title = order == 1 ? "Frequency response of the fundamental"
                       : fmt::format("H{} over frequency, by swept sine", order);
  f.note = conditions_line(data);
  f.x.label = "frequency of the fundamental, Hz";
  f.x.logarithmic = true;
  f.y.label = order == 1 ? "output less drive, dB" : "relative to the fundamental, dB";
  std::map<std::pair<double, double>, double> fundamental;  // by drive and frequency
  std::set<double> drives;
  for (const ResponsePoint& p : data.curves.responses) {
    if (p.method != "sweep") continue;
    drives.insert(p.drive);
    if (p.order == 1 && p.magnitude_db) fundamental[{p.drive, p.frequency_hz}] = *p.magnitude_db;
  }
  int colour = 0;
  for (const double drive : spread_out(drives)) {
    Series s;
    s.label = at_drive(data, drive);
    s.style = SeriesStyle::line;
    s.colour = colour++;
    for (const ResponsePoint& p : data.curves.responses) {
      if (p.method != "sweep" || p.order != order || p.drive != drive || !p.magnitude_db) continue;
      if (p.flag == Flag::alias) continue;
      if (p.flag == Flag::noise) {
        s.points.push_back(gap_at(p.frequency_hz));
        continue;
      }
      const auto reference = fundamental.find({drive, p.frequency_hz});
      if (order > 1 && reference == fundamental.end()) continue;
      const double y = order == 1 ? *p.magnitude_db : *p.magnitude_db - reference->second;
      s.points.push_back(point_of(p.frequency_hz, y, {}, p.flag));
    }
    if (is_mostly_seen(s)) f.series.push_back(std::move(s));
  }
  f.caption =
      order == 1
          ? "Level of the fundamental at the output less the drive, by a synchronised swept sine. "
            "Uncertainties stand in curves/response.csv."
          : fmt::format(
                "H{} relative to the fundamental at the output, over the frequency of the "
                "fundamental. Points under the noise are left out; they and all "
                "uncertainties stand in curves/response.csv.",
                order);
  return f;
}

Figure glide_figure(const ReportData& data) {
  Figure f;
  f.id = "glide";
  f.title = "Harmonics while the level glides up and down";
  f.note = conditions_line(data);
  f.x.label = fmt::format("drive, {}", drive_unit(data));
  f.y.label = "level relative to the fundamental, dB";
  for (int order = 2; order <= 5; ++order) {
    for (const char* direction : {"up", "down"}) {
      Series s;
      s.colour = order - 2;
      s.style = std::string(direction) == "up" ? SeriesStyle::line : SeriesStyle::dashed;
      s.label = fmt::format("H{} {}", order, direction);
      for (const GlidePoint& p : data.curves.glides) {
        if (p.order != order || p.direction != direction || !p.relative_db) continue;
        if (p.flag == Flag::alias) continue;
        if (p.flag == Flag::noise) {
          s.points.push_back(gap_at(p.drive));
          continue;
        }
        s.points.push_back(point_of(p.drive, *p.relative_db, {}, p.flag));
      }
      std::sort(s.points.begin(), s.points.end(), [](auto& a, auto& b) { return a.x < b.x; });
      if (!s.points.empty()) f.series.push_back(std::move(s));
    }
  }
  f.caption =
      "One sine, its level rising smoothly over the whole ladder and falling again. Where solid "
      "(up) and dashed (down) part, the unit remembers: the loop's width stands in the table of "
      "memory and drift. Points under the noise are left out.";
  return f;
}

/// Traces of one method at its highest drive.
Figure trace_figure(const ReportData& data, const std::string& method,
                    const std::vector<std::pair<std::string, std::string>>& traces) {
  Figure f;
  double highest = -INFINITY;
  for (const TracePoint& p : data.curves.traces) {
    if (p.method == method && p.drive) highest = std::max(highest, *p.drive);
  }
  f.note = fmt::format("{} · drive {}", conditions_line(data), at_drive(data, highest));
  int colour = 0;
  for (const auto& [trace, label] : traces) {
    Series s;
    s.label = label;
    s.colour = colour++;
    for (const TracePoint& p : data.curves.traces) {
      if (p.method != method || p.trace != trace || p.drive != highest || !p.value) continue;
      s.points.push_back(point_of(p.x, *p.value, p.expanded_u, p.flag));
    }
    if (!s.points.empty()) f.series.push_back(std::move(s));
  }
  return f;
}

Figure multitone_figure(const ReportData& data) {
  Figure f = trace_figure(
      data, "multitone",
      {{"distortion", "distortion"}, {"noise", "noise"}, {"masked-threshold", "masked threshold"}});
  f.id = "multitone";
  f.title = "Distortion of a multitone, band by band";
  f.x.label = "centre of the band, Hz";
  f.x.logarithmic = true;
  f.y.label = "level in a band of 1 ERB, dB SPL";
  for (Series& s : f.series) {
    if (s.label == "masked threshold") s.style = SeriesStyle::dashed;
  }
  f.caption =
      "31 tones a third of an octave apart, at the highest drive at which they were played, as "
      "heard at the stated listening level. Distortion above the dashed threshold is not masked by "
      "the tones (a simple model of masking, no listening test).";
  return f;
}

Figure burst_figure(const ReportData& data) {
  Figure f = trace_figure(data, "burst", {{"gain", "gain"}});
  f.id = "burst";
  f.title = "Gain of a low tone after a burst";
  f.x.label = "time after the burst, s";
  f.y.label = "relative to before the burst, dB";
  f.caption =
      "A low tone before and after a burst at the drive stated; the difference is what the burst "
      "leaves behind: recovery of a gain control, blocking of a coupled stage. Bars: 95 %.";
  return f;
}

}  // namespace

std::vector<Figure> method_figures(const ReportData& data) {
  std::vector<Figure> figures;
  for (int order = 1; order <= kHighestOrder; ++order) figures.push_back(swept_figure(data, order));
  figures.push_back(glide_figure(data));
  figures.push_back(multitone_figure(data));
  figures.push_back(burst_figure(data));
  std::erase_if(figures, [](const Figure& f) { return f.series.empty(); });
  return figures;
}

}  // namespace kneeprint
