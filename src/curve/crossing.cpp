// SPDX-License-Identifier: GPL-3.0-or-later
#include "curve/crossing.h"

#include <algorithm>
#include <cmath>

#include "quantity/uncertain.h"

namespace kneeprint {
namespace {

struct Sample {
  double x = 0.0, y = 0.0;
  Cell expanded_u;  ///< of y
};

/// Second derivative at the middle of three samples.
double curvature(const Sample& a, const Sample& b, const Sample& c) {
  return 2.0 * ((c.y - b.y) / (c.x - b.x) - (b.y - a.y) / (b.x - a.x)) / (c.x - a.x);
}

/// How far the curve may lie from the straight line between samples i - 1 and i, at `share` of the
/// step.
double straight_line_error(const std::vector<Sample>& run, std::size_t i, double share) {
  double bend = 0.0;
  if (i >= 2) bend = std::abs(curvature(run[i - 2], run[i - 1], run[i]));
  if (i + 1 < run.size())
    bend = std::max(bend, std::abs(curvature(run[i - 1], run[i], run[i + 1])));
  const double step = run[i].x - run[i - 1].x;
  return 0.5 * bend * share * (1.0 - share) * step * step;
}

/// Crossings of `level` along rungs that follow each other without a gap.
void add_crossings(const std::vector<Sample>& run, double level, std::vector<Crossing>& found) {
  for (std::size_t i = 1; i < run.size(); ++i) {
    const Sample &a = run[i - 1], &b = run[i];
    const bool above_a = a.y >= level, above_b = b.y >= level;
    if (above_a == above_b) continue;
    const double share = (level - a.y) / (b.y - a.y);
    Crossing c;
    c.drive = a.x + share * (b.x - a.x);
    c.direction = above_b ? Direction::up : Direction::down;
    if (a.expanded_u && b.expanded_u) {
      const double noise = *a.expanded_u + share * (*b.expanded_u - *a.expanded_u);
      const double slope = (b.y - a.y) / (b.x - a.x);
      c.expanded_u_db = std::hypot(noise, straight_line_error(run, i, share)) / std::abs(slope);
    }
    found.push_back(c);
  }
}

/// Relative standard uncertainty of the fundamental from noise alone, expanded to 95 %, in dB.
Cell noise_of_fundamental(const Curves& curves, const LevelPoint& level) {
  for (const auto& h : curves.harmonics) {
    if (h.order != 1 || h.frequency_hz != level.frequency_hz || h.drive != level.drive) continue;
    const double size = std::hypot(h.in_phase, h.quadrature);
    if (!(size > 0.0)) return {};
    return 20.0 / std::log(10.0) * coverage_factor_95(h.dof) * h.component_u / size;
  }
  return {};
}

// Harmonics under the noise leave the gain usable; a fundamental under it shows by the missing THD.
bool gain_is_usable(const LevelPoint& p) {
  const bool lost = p.flag == Flag::noise && !p.thd_f_percent;
  return p.output && !lost && p.flag != Flag::clipped && p.flag != Flag::unsteady;
}

std::optional<Sample> thd_sample(const LevelPoint& p) {
  if (p.flag != Flag::none || !p.thd_f_percent || *p.thd_f_percent <= 0.0) return std::nullopt;
  Sample s{p.drive, 20.0 * std::log10(*p.thd_f_percent), {}};
  if (p.thd_f_u_percent)
    s.expanded_u = 20.0 / std::log(10.0) * *p.thd_f_u_percent / *p.thd_f_percent;
  return s;
}

}  // namespace

std::vector<double> frequencies_of(const std::vector<LevelPoint>& levels) {
  std::vector<double> f;
  for (const auto& p : levels) f.push_back(p.frequency_hz);
  std::sort(f.begin(), f.end());
  f.erase(std::unique(f.begin(), f.end()), f.end());
  return f;
}

std::vector<LevelPoint> at_frequency(const std::vector<LevelPoint>& levels, double frequency_hz) {
  std::vector<LevelPoint> some;
  for (const auto& p : levels)
    if (p.frequency_hz == frequency_hz) some.push_back(p);
  std::stable_sort(some.begin(), some.end(),
                   [](const auto& a, const auto& b) { return a.drive < b.drive; });
  return some;
}

std::vector<Crossing> thd_crossings(const std::vector<LevelPoint>& levels, double frequency_hz,
                                    double percent) {
  std::vector<Crossing> found;
  std::vector<Sample> run;
  const double level = 20.0 * std::log10(percent);
  for (const auto& p : at_frequency(levels, frequency_hz)) {
    if (const auto here = thd_sample(p)) {
      run.push_back(*here);
      continue;
    }
    add_crossings(run, level, found);
    run.clear();
  }
  add_crossings(run, level, found);
  return found;
}

std::vector<RelativeGain> relative_gain(const Curves& curves, double frequency_hz) {
  std::vector<RelativeGain> gains;
  double reference = 0.0;
  Cell reference_u;
  for (const auto& p : at_frequency(curves.levels, frequency_hz)) {
    if (!gain_is_usable(p)) continue;
    const double gain = p.gain_db.value_or(*p.output - p.drive);
    const Cell u = noise_of_fundamental(curves, p);
    if (gains.empty()) {
      reference = gain;
      reference_u = u;
    }
    RelativeGain g{p.drive, gain - reference, {}};
    if (u && reference_u) g.expanded_u_db = gains.empty() ? 0.0 : std::hypot(*u, *reference_u);
    gains.push_back(g);
  }
  return gains;
}

std::optional<Crossing> compression_point(const std::vector<RelativeGain>& gain, Decibels drop) {
  std::vector<Sample> run;
  for (const auto& g : gain) run.push_back({g.drive, g.db, g.expanded_u_db});
  std::vector<Crossing> found;
  add_crossings(run, -drop.value(), found);
  for (const auto& c : found)
    if (c.direction == Direction::down) return c;
  return std::nullopt;
}

}  // namespace kneeprint
