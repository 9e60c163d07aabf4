// SPDX-License-Identifier: GPL-3.0-or-later
#include "figure/surface_painter.h"

#include <cairo.h>
#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <map>
#include <set>

#include "figure/cairo_text.h"
#include "figure/palette.h"

namespace kneeprint {
namespace {

constexpr TextStyle kCellText{7.5, false, false, kInk};
constexpr TextStyle kCellTextOnDark{7.5, false, false, kPaper};
constexpr TextStyle kLegendText{8.5, false, false, kSoftInk};
constexpr std::size_t kFirstDark = 4;  ///< of the ramp: light letters from here up
constexpr double kSwatch = 14.0;

/// Edges between sorted positions, half way in the axis' own measure, and as far outside.
std::map<double, std::pair<double, double>> extents(const std::set<double>& positions,
                                                    bool logarithmic) {
  const auto forth = [&](double v) { return logarithmic ? std::log(v) : v; };
  const auto back = [&](double v) { return logarithmic ? std::exp(v) : v; };
  const std::vector<double> at(positions.begin(), positions.end());
  std::map<double, std::pair<double, double>> out;
  for (std::size_t i = 0; i < at.size(); ++i) {
    const double here = forth(at[i]);
    double below = i > 0 ? here - forth(at[i - 1]) : 0.0;
    double above = i + 1 < at.size() ? forth(at[i + 1]) - here : 0.0;
    if (i == 0) below = above;
    if (i + 1 == at.size()) above = below;
    if (at.size() == 1) below = above = logarithmic ? std::log(2.0) : 1.0;
    out[at[i]] = {back(here - below / 2.0), back(here + above / 2.0)};
  }
  return out;
}

/// The smallest of 1, 2, 2.5, 5 times a power of ten that is not under `step`.
double round_up(double step) {
  const double decade = std::pow(10.0, std::floor(std::log10(step)));
  for (const double m : {1.0, 2.0, 2.5, 5.0}) {
    if (m * decade >= step * (1.0 - 1e-9)) return m * decade;
  }
  return 10.0 * decade;
}

std::size_t colour_of(double value, const std::vector<double>& steps) {
  const auto above = std::upper_bound(steps.begin(), steps.end(), value);
  const auto index = std::max<long>(0, above - steps.begin() - 1);
  return std::min<std::size_t>(static_cast<std::size_t>(index), kRamp.size() - 1);
}

std::string bound_text(double v) {
  const std::string text = fmt::format("{:.2g}", v);
  return text.front() == '-' ? "\u2212" + text.substr(1) : text;
}

}  // namespace

std::vector<double> surface_steps(const Surface& surface) {
  std::vector<double> values;
  for (const SurfaceCell& c : surface.cells) {
    if (std::isfinite(c.value) && (!surface.logarithmic || c.value > 0.0)) {
      values.push_back(surface.logarithmic ? std::log10(c.value) : c.value);
    }
  }
  if (values.empty()) return {};
  const auto [low, high] = std::minmax_element(values.begin(), values.end());
  const auto colours = static_cast<double>(kRamp.size());
  const double step = round_up(std::max(*high - *low, 1e-6) / (colours - 1.0));
  double start = std::floor(*low / step) * step;
  std::vector<double> steps;
  for (std::size_t i = 0; i <= kRamp.size(); ++i) {
    const double bound = start + static_cast<double>(i) * step;
    steps.push_back(surface.logarithmic ? std::pow(10.0, bound) : bound);
  }
  return steps;
}

std::pair<double, double> surface_range(const std::vector<double>& positions, bool logarithmic) {
  const auto all = extents({positions.begin(), positions.end()}, logarithmic);
  if (all.empty()) return {0.0, 1.0};
  return {all.begin()->second.first, all.rbegin()->second.second};
}

double surface_legend_width(cairo_t* cr, const Surface& surface) {
  double widest = 0.0;
  for (const double s : surface_steps(surface)) {
    widest = std::max(widest, text_width(cr, bound_text(s), kLegendText));
  }
  return kSwatch + 6.0 + widest;
}

void paint_surface(cairo_t* cr, const Figure& figure, const AxisMap& x, const AxisMap& y,
                   const Box& plot, double legend_left) {
  const Surface& surface = *figure.surface;
  const std::vector<double> steps = surface_steps(surface);
  if (steps.empty()) return;
  std::set<double> xs, ys;
  for (const SurfaceCell& c : surface.cells) {
    xs.insert(c.x);
    ys.insert(c.y);
  }
  const auto columns = extents(xs, figure.x.logarithmic), rows = extents(ys, figure.y.logarithmic);
  for (const SurfaceCell& c : surface.cells) {
    if (!std::isfinite(c.value)) continue;
    const double left = x.at_clamped(columns.at(c.x).first),
                 right = x.at_clamped(columns.at(c.x).second),
                 bottom = y.at_clamped(rows.at(c.y).first), top = y.at_clamped(rows.at(c.y).second);
    const std::size_t colour = colour_of(c.value, steps);
    cairo_rectangle(cr, left, top, right - left, bottom - top);
    set_colour(cr, kRamp[colour]);
    cairo_fill_preserve(cr);
    set_colour(cr, kPaper);
    cairo_set_line_width(cr, 0.6);
    cairo_stroke(cr);
    const TextStyle& style = colour >= kFirstDark ? kCellTextOnDark : kCellText;
    if (c.doubtful) {
      set_colour(cr, style.colour, 0.5);
      cairo_set_line_width(cr, 0.7);
      cairo_move_to(cr, left + 2.0, bottom - 2.0);
      cairo_line_to(cr, right - 2.0, top + 2.0);
      cairo_stroke(cr);
    }
    const double width = text_width(cr, c.text, style);
    if (width + 3.0 <= right - left && style.size + 2.0 <= bottom - top) {
      draw_text(cr, c.text, (left + right - width) / 2.0, (top + bottom) / 2.0 + 0.36 * style.size,
                style);
    }
  }
  // The legend, high at the top as in the plot.
  const double height = std::min(22.0, (plot.bottom - plot.top) / (kRamp.size() + 1.0));
  const double base = plot.top + 8.0 + height * static_cast<double>(kRamp.size());
  for (std::size_t i = 0; i < kRamp.size(); ++i) {
    const double bottom = base - height * static_cast<double>(i);
    set_colour(cr, kRamp[i]);
    cairo_rectangle(cr, legend_left, bottom - height, kSwatch, height);
    cairo_fill(cr);
  }
  for (std::size_t i = 0; i < steps.size(); ++i) {
    draw_text(cr, bound_text(steps[i]), legend_left + kSwatch + 5.0,
              base - height * static_cast<double>(i) + 0.36 * kLegendText.size, kLegendText);
  }
}

}  // namespace kneeprint
