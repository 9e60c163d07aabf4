// SPDX-License-Identifier: GPL-3.0-or-later
#include "report/surface_figures.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <functional>
#include <set>

#include "curve/crossing.h"
#include "figure/surface_painter.h"
#include "report/number_text.h"
#include "report/report_facts.h"

namespace kneeprint {
namespace {

constexpr std::size_t kLeastFrequencies = 4, kLeastRungs = 3;
// Drives that a reference return reads differ a little from take to take; a rung is one row.
constexpr double kSameRung = 0.5;  // dB

/// The rungs of the ladder as drives, rising.
std::vector<double> rungs_of(const ReportData& data) {
  std::vector<double> drives;
  for (const LevelPoint& p : data.curves.levels) drives.push_back(p.drive);
  std::sort(drives.begin(), drives.end());
  std::vector<double> rungs;
  for (const double d : drives) {
    if (rungs.empty() || d - rungs.back() > kSameRung) rungs.push_back(d);
  }
  return rungs;
}

double rung_of(double drive, const std::vector<double>& rungs) {
  return *std::min_element(rungs.begin(), rungs.end(), [&](double a, double b) {
    return std::abs(a - drive) < std::abs(b - drive);
  });
}

class Map {
 public:
  Map(const ReportData& data, std::string id, std::string title, bool logarithmic)
      : rungs_(rungs_of(data)) {
    figure_.id = std::move(id);
    figure_.title = std::move(title);
    figure_.note = conditions_line(data);
    figure_.x.label = "frequency, Hz";
    figure_.x.logarithmic = true;
    figure_.y.label = fmt::format("drive, {}", drive_unit(data));
    figure_.surface.emplace().logarithmic = logarithmic;
  }

  void add(double hz, double drive, double value, const std::string& text, Flag flag) {
    SurfaceCell c;
    c.x = hz;
    c.y = rung_of(drive, rungs_);
    c.value = value;
    c.upper_limit = flag == Flag::noise;
    c.text = c.upper_limit ? "<" + text : text;
    c.doubtful = flag != Flag::none && flag != Flag::noise;
    figure_.surface->cells.push_back(std::move(c));
  }

  Figure finish(const std::string& caption) {
    std::vector<double> xs, ys;
    for (const SurfaceCell& c : figure_.surface->cells) {
      xs.push_back(c.x);
      ys.push_back(c.y);
    }
    const auto x = surface_range(xs, true), y = surface_range(ys, false);
    figure_.x.low = x.first;
    figure_.x.high = x.second;
    figure_.y.low = y.first;
    figure_.y.high = y.second;
    figure_.caption = caption +
                      " One cell for each frequency and rung, dark where the figure is high; \"<\" "
                      "marks an upper limit under the noise, a stroke a flagged point.";
    return std::move(figure_);
  }

 private:
  std::vector<double> rungs_;
  Figure figure_;
};

Figure thd_map(const ReportData& data) {
  Map map(data, "surface-thd", "Total harmonic distortion over frequency and drive, THD_F in %",
          true);
  for (const LevelPoint& p : data.curves.levels) {
    if (!p.thd_f_percent || !(*p.thd_f_percent > 0.0)) continue;
    map.add(p.frequency_hz, p.drive, *p.thd_f_percent, short_text(*p.thd_f_percent, 2), p.flag);
  }
  return map.finish(
      "THD_F, the root sum of squares of the harmonics that lie in the band over the fundamental.");
}

Figure harmonic_map(const ReportData& data, int order) {
  Map map(data, fmt::format("surface-h{}", order),
          fmt::format("H{} over frequency and drive, dB below the fundamental", order), false);
  for (const HarmonicPoint& p : data.curves.harmonics) {
    if (p.order != order || !p.relative_db || p.flag == Flag::alias) continue;
    map.add(p.frequency_hz, p.drive, *p.relative_db, fixed_text(*p.relative_db, 0), p.flag);
  }
  return map.finish(fmt::format("Level of H{} relative to the fundamental.", order));
}

Figure compression_map(const ReportData& data) {
  Map map(data, "surface-gain", "Gain over frequency and drive, dB relative to the lowest rung",
          false);
  for (const double hz : frequencies_of(data.curves.levels)) {
    for (const RelativeGain& g : relative_gain(data.curves, hz)) {
      map.add(hz, g.drive, g.db, fixed_text(g.db, 1), Flag::none);
    }
  }
  return map.finish(
      "Output of the fundamental minus drive, against the same at the lowest usable rung of each "
      "frequency.");
}

}  // namespace

std::vector<Figure> surface_figures(const ReportData& data) {
  if (frequencies_of(data.curves.levels).size() < kLeastFrequencies ||
      rungs_of(data).size() < kLeastRungs) {
    return {};
  }
  std::vector<Figure> figures{thd_map(data), harmonic_map(data, 2), harmonic_map(data, 3),
                              compression_map(data)};
  std::erase_if(figures, [](const Figure& f) { return f.surface->cells.empty(); });
  return figures;
}

}  // namespace kneeprint
