// SPDX-License-Identifier: GPL-3.0-or-later
#include <fmt/format.h>
#include <fmt/ranges.h>

#include <algorithm>
#include <cmath>
#include <compare>
#include <map>
#include <set>

#include "curve/crossing.h"
#include "report/method_figures.h"
#include "report/number_text.h"
#include "report/report.h"
#include "report/report_facts.h"
#include "report/surface_figures.h"

namespace kneeprint {
namespace {

constexpr int kFirstOrder = 2, kLastOrder = 7;  ///< of the harmonics figure
constexpr int kGrey = 5, kBlack = 6;            ///< palette places of lines that are no data

double percent_of_db(double db) { return 100.0 * std::pow(10.0, db / 20.0); }

std::string drive_label(const ReportData& data) {
  return fmt::format("drive, {}", drive_unit(data));
}

std::string conditions(const ReportData& data, double frequency_hz) {
  return fmt::format("{} · {} Hz · {}", unit_label(data), short_text(frequency_hz, 6),
                     rig_line(data.rig));
}

using FloorByDrive = std::map<double, double>;

void raise_floor(FloorByDrive& floor, double drive, double value) {
  const auto [at, added] = floor.try_emplace(drive, value);
  if (!added) at->second = std::max(at->second, value);
}

void add_floor(Figure& figure, const FloorByDrive& floor) {
  if (floor.empty()) return;
  Band band{"rig floor", {}};
  for (const auto& [drive, value] : floor) {
    FigurePoint p;
    p.x = drive;
    p.high = value;
    band.points.push_back(p);
  }
  figure.bands.push_back(std::move(band));
}

bool has_points(const Figure& f) {
  return std::any_of(f.series.begin(), f.series.end(),
                     [](const Series& s) { return !s.points.empty(); });
}

Figure start(const std::string& id, const std::string& title, const std::string& note,
             const ReportData& data, const std::string& y_label) {
  Figure f;
  f.id = id;
  f.title = title;
  f.note = note;
  f.x.label = drive_label(data);
  f.y.label = y_label;
  return f;
}

// --- harmonics

Figure harmonics_figure(const ReportData& data, double frequency_hz) {
  Figure f = start("harmonics", "Harmonics", conditions(data, frequency_hz), data,
                   "level relative to the fundamental, dB");
  std::map<int, Series> orders;
  FloorByDrive floor;  // the highest of the drawn orders, by drive
  for (const auto& p : data.curves.harmonics) {
    if (p.frequency_hz != frequency_hz || p.order < kFirstOrder || p.order > kLastOrder) continue;
    if (p.floor_db) raise_floor(floor, p.drive, *p.floor_db);
    if (!p.relative_db || p.flag == Flag::alias) continue;
    Series& s = orders[p.order];
    s.label = fmt::format("H{}", p.order);
    s.colour = p.order - kFirstOrder;
    FigurePoint point;
    point.x = p.drive;
    point.y = *p.relative_db;
    if (p.flag == Flag::noise) {
      point.upper_limit = true;
    } else {
      point.doubtful = p.flag != Flag::none;
      // An interval that reaches zero amplitude has no lower end in dB: it runs off the figure.
      point.low = p.relative_low_db.value_or(-1000.0);
      point.high = p.relative_high_db;
      if (!p.relative_low_db && !p.relative_high_db) {
        const bool known = p.expanded_u_db.has_value();
        point.low = known ? Cell(point.y - *p.expanded_u_db) : Cell();
        point.high = known ? Cell(point.y + *p.expanded_u_db) : Cell();
      }
    }
    s.points.push_back(point);
  }
  for (auto& [order, s] : orders) f.series.push_back(std::move(s));
  add_floor(f, floor);
  f.caption = fmt::format(
      "H{} to H{} at {} Hz, each relative to the fundamental at the output. Bars: 95 % interval, "
      "drawn where it is larger than its marker. Arrows down: upper limits of harmonics under the "
      "noise. Hollow: flagged points (see the table of levels). {}",
      kFirstOrder, kLastOrder, short_text(frequency_hz, 6),
      floor.empty() ? "The rig floor is not known."
                    : "Shaded: the rig floor, the highest of these orders.");
  return f;
}

// --- distortion

std::optional<double> thd_floor_percent(const ReportData& data, const LevelPoint& level) {
  double power = 0.0;
  for (const auto& h : data.curves.harmonics)
    if (h.frequency_hz == level.frequency_hz && h.drive == level.drive && h.order >= 2 &&
        h.order <= level.thd_orders && h.floor_db)
      power += std::pow(10.0, *h.floor_db / 10.0);
  if (power <= 0.0) return std::nullopt;
  return 100.0 * std::sqrt(power);
}

FigurePoint percent_point(double drive, double percent, const Cell& u, Flag flag) {
  FigurePoint p;
  p.x = drive;
  p.y = percent;
  p.upper_limit = flag == Flag::noise;
  p.doubtful = flag != Flag::none && flag != Flag::noise;
  if (u && !p.upper_limit) {
    p.low = percent - *u;
    p.high = percent + *u;
  }
  return p;
}

Figure thd_figure(const ReportData& data, double fit_hz) {
  Figure f = start("thd", "Total harmonic distortion", conditions_line(data), data,
                   "relative to the fundamental, %");
  f.y.logarithmic = true;
  FloorByDrive floor;
  int colour = 0, orders = 0;
  for (double hz : frequencies_of(data.curves.levels)) {
    Series thd, thdn;
    thd.label = frequency_text(hz);
    thd.colour = thdn.colour = colour++;
    for (const auto& p : at_frequency(data.curves.levels, hz)) {
      orders = std::max(orders, p.thd_orders);
      if (p.thd_f_percent && *p.thd_f_percent > 0.0)
        thd.points.push_back(percent_point(p.drive, *p.thd_f_percent, p.thd_f_u_percent, p.flag));
      if (p.thdn_percent && *p.thdn_percent > 0.0 && hz == fit_hz)
        thdn.points.push_back(percent_point(p.drive, *p.thdn_percent, {}, Flag::none));
      if (const auto here = thd_floor_percent(data, p)) raise_floor(floor, p.drive, *here);
    }
    f.series.push_back(std::move(thd));
    if (!thdn.points.empty()) {
      thdn.label = frequency_text(hz) + " THD+N";
      thdn.style = SeriesStyle::dashed;
      f.series.push_back(std::move(thdn));
    }
  }
  add_floor(f, floor);
  for (double percent : kThdMarks) f.marks.push_back({short_text(percent) + " %", false, percent});
  f.caption = fmt::format(
      "THD_F, the root sum of squares of H2 to H{} (fewer where they leave the band) over the "
      "fundamental, with 95 % intervals where visible; arrows down are upper limits, hollow points "
      "are flagged. Dashed: THD+N at {}, 20 Hz to 20 kHz. {}",
      orders, frequency_text(fit_hz),
      floor.empty() ? "The rig floor is not known."
                    : "Shaded: the rig floor, summed the same way.");
  return f;
}

// --- compression

Figure compression_figure(const ReportData& data) {
  Figure f = start("compression", "Compression", conditions_line(data), data,
                   "gain relative to the lowest usable rung, dB");
  int colour = 0;
  double lowest = 0.0;
  std::set<std::string> references;
  for (double hz : frequencies_of(data.curves.levels)) {
    Series s;
    s.label = frequency_text(hz);
    s.colour = colour++;
    const auto gain = relative_gain(data.curves, hz);
    for (const auto& g : gain) {
      FigurePoint p;
      p.x = g.drive;
      p.y = g.db;
      lowest = std::min(lowest, g.db);
      s.points.push_back(p);
    }
    if (!gain.empty()) references.insert(fixed_text(gain[0].drive, 1));
    f.series.push_back(std::move(s));
  }
  if (lowest > -0.5) {  // noise is not to look like compression
    f.y.low = -1.0;
    f.y.high = 1.0;
  }
  for (double drop : kCompressionMarks)
    f.marks.push_back({fmt::format("{}{} dB", kMinus, short_text(drop)), false, -drop});
  f.caption = fmt::format(
      "Output of the fundamental minus drive, against the same at the lowest usable rung of each "
      "frequency ({} {}).",
      fmt::join(references, " and "), drive_unit(data));
  return f;
}

// --- two tones

struct TonesPlayed {
  double f1, f2, ratio;
  friend auto operator<=>(const TonesPlayed&, const TonesPlayed&) = default;
};

TonesPlayed tones_of(const IntermodPoint& p) { return {p.f1_hz, p.f2_hz, p.ratio}; }

struct TwoToneKind {
  std::string method;
  std::vector<std::string> products;
  std::string title, reference, definition;
};

const std::vector<TwoToneKind>& two_tone_kinds() {
  static const std::string kUpper = "relative to the upper tone, %";
  static const std::string kBoth = "relative to the sum of both tones, %";
  static const std::string kSidebands =
      "m2 and m3: arithmetic sum of the pair of sidebands of second and third order over the upper "
      "tone (IEC 60268-3).";
  static const std::vector<TwoToneKind> kinds{
      {"smpte", {"m2", "m3"}, "Modulation distortion", kUpper, kSidebands},
      {"din", {"m2", "m3"}, "Modulation distortion", kUpper, kSidebands},
      {"modulation", {"m2", "m3"}, "Modulation distortion", kUpper, kSidebands},
      {"ccif",
       {"d2", "d3"},
       "Difference-frequency distortion",
       kBoth,
       "d2 and d3: products of second and third order over the arithmetic sum of both tones (IEC "
       "60268-3)."},
      {"tdfd",
       {"total"},
       "Total difference-frequency distortion",
       kBoth,
       "Root sum of squares of the lower products of second and third order, over the arithmetic "
       "sum of both tones (IEC 60268-3)."}};
  return kinds;
}

Figure two_tone_figure(const ReportData& data, const TwoToneKind& kind, const TonesPlayed& tones,
                       const std::string& id, const HoldoutFamily* predicted) {
  const std::string& method = kind.method;
  Figure f = start(id, kind.title, "", data, "");
  f.y.logarithmic = true;
  FloorByDrive floor;
  int colour = 0;
  for (const auto& product : kind.products) {
    Series measured;
    measured.style = SeriesStyle::markers;
    measured.label = product + " measured";
    measured.colour = colour;
    for (const auto& p : data.curves.intermods) {
      if (p.method != method || p.product != product || tones_of(p) != tones) continue;
      if (p.floor_db) raise_floor(floor, p.drive, percent_of_db(*p.floor_db));
      if (!p.db) continue;
      FigurePoint point = percent_point(p.drive, percent_of_db(*p.db), {}, p.flag);
      if (p.expanded_u_db && !point.upper_limit) {
        point.low = percent_of_db(*p.db - *p.expanded_u_db);
        point.high = percent_of_db(*p.db + *p.expanded_u_db);
      }
      measured.points.push_back(point);
    }
    Series line;
    line.style = SeriesStyle::line;
    line.colour = colour++;
    if (predicted) {
      line.label = fmt::format("{} {}", product, predicted->family);
      for (const auto& p : predicted->points) {
        if (p.method != method || p.product != product) continue;
        FigurePoint point;
        point.x = p.drive;
        point.y = percent_of_db(p.predicted_db);
        line.points.push_back(point);
      }
      std::sort(line.points.begin(), line.points.end(),
                [](const auto& a, const auto& b) { return a.x < b.x; });
      // A curve without memory has the same products with every pair: one point a drive.
      line.points.erase(std::unique(line.points.begin(), line.points.end(),
                                    [](const auto& a, const auto& b) { return a.x == b.x; }),
                        line.points.end());
    }
    // A prediction far under everything measured would stretch the axis for nothing.
    double least = INFINITY;
    for (const auto& p : measured.points) least = std::min(least, p.y);
    std::erase_if(line.points, [&](const FigurePoint& p) { return p.y < 0.1 * least; });
    if (!line.points.empty()) f.series.push_back(std::move(line));
    if (!measured.points.empty()) f.series.push_back(std::move(measured));
  }
  add_floor(f, floor);
  f.note = fmt::format("{} · {} and {}, {}:1 · {}", unit_label(data), frequency_text(tones.f1),
                       frequency_text(tones.f2), short_text(tones.ratio), rig_line(data.rig));
  f.y.label = kind.reference;
  f.caption = kind.definition +
              " Drive is that of the sine with the same peak. Bars: 95 % interval where visible.";
  if (predicted)
    f.caption += fmt::format(
        " Lines: what the {} curve, fitted to the harmonics alone, predicts{}.", predicted->family,
        data.model->frequency_dependent
            ? "; no hold-out test here, since the unit depends on frequency"
            : "");
  return f;
}

// One figure for each pair and ratio that a method played.
std::vector<Figure> two_tone_figures(const ReportData& data) {
  std::vector<Figure> figures;
  for (const TwoToneKind& kind : two_tone_kinds()) {
    std::set<TonesPlayed> played;
    std::set<double> ratios;
    for (const IntermodPoint& p : data.curves.intermods) {
      if (p.method != kind.method) continue;
      played.insert(tones_of(p));
      ratios.insert(p.ratio);
    }
    // Predictions are kept without their ratio: with several they cannot be told apart.
    const HoldoutFamily* predicted = ratios.size() == 1 ? best_holdout(data) : nullptr;
    int count = 0;
    for (const TonesPlayed& tones : played) {
      const std::string id = ++count == 1 ? kind.method : fmt::format("{}-{}", kind.method, count);
      figures.push_back(two_tone_figure(data, kind, tones, id, predicted));
    }
  }
  return figures;
}

// --- transfer curve

Figure transfer_figure(const ReportData& data, double fit_hz) {
  const Model& model = *data.model;
  const FittedFamily& best = model.fit.families[model.fit.best];
  const SigmoidParameters p = best.point();
  const std::string in_unit = model.axis_unit == "V" ? "V" : "full scales";
  const std::string out_unit = model.axis_unit == "relative" ? "relative" : in_unit;
  Figure f;
  f.id = "transfer";
  f.title = fmt::format("Transfer curve, {}", best.family->title);
  f.x.label = "input, " + in_unit;
  f.y.label = "output, " + out_unit;

  double top = 0.0;
  for (const auto& point : at_frequency(data.curves.levels, fit_hz))
    if (point.flag != Flag::clipped)
      top = std::max(top, data.rig.send_scale.peak_of_level(point.drive));
  if (!(top > 0.0)) return f;
  const double centre = p.drive != 0.0 ? -p.bias / p.drive : 0.0;
  const bool centre_in_sight = std::abs(centre) <= 1.5 * top;
  const bool at_rest = std::abs(centre) < 0.05 * top;  // too close to be marked apart
  const double reach = centre_in_sight ? std::max(top, 1.05 * std::abs(centre)) : top;

  const auto curve = [&](double x) { return evaluate(*best.family, p, x); };
  Series line, tangent;
  line.style = SeriesStyle::line;
  line.label = "curve";
  const double slope = best.family->slope(p.bias, p.sharpness) * p.limit * p.drive;
  tangent.style = SeriesStyle::dashed;
  tangent.colour = kGrey;
  tangent.label = "small-signal gain";
  constexpr int kSteps = 200;
  double low = 0.0, high = 0.0;
  for (int i = -kSteps; i <= kSteps; ++i) {
    const double x = top * i / kSteps;
    low = std::min(low, curve(x));
    high = std::max(high, curve(x));
  }
  for (int i = -kSteps; i <= kSteps; ++i) {
    FigurePoint point;
    point.x = reach * i / kSteps;
    point.y = curve(point.x);
    line.points.push_back(point);
    point.y = slope * point.x;
    if (point.y >= 1.25 * low && point.y <= 1.25 * high) tangent.points.push_back(point);
  }
  const double s_bias = best.family->value(p.bias, p.sharpness);
  const double span = high - low;
  for (const auto& [label, at] : {std::pair("upper limit", p.limit * (1.0 - s_bias)),
                                  std::pair("lower limit", -p.limit * (1.0 + s_bias))}) {
    if (at > high + 0.5 * span || at < low - 0.5 * span) continue;
    f.marks.push_back({label, false, at});
    // A labelled line on the frame itself would be lost: leave room around it.
    high = std::max(high, at + 0.04 * span);
    low = std::min(low, at - 0.04 * span);
  }
  f.series = {std::move(tangent), std::move(line)};
  Series rest;
  rest.style = SeriesStyle::markers;
  rest.colour = kBlack;
  rest.label = at_rest ? "rest, at the centre of symmetry" : "rest";
  rest.label_at_point = true;
  rest.points.emplace_back();
  f.series.push_back(std::move(rest));
  if (centre_in_sight && !at_rest) {
    Series mark;
    mark.style = SeriesStyle::markers;
    mark.colour = 1;
    mark.label = "centre of symmetry";
    mark.label_at_point = true;
    FigurePoint point;
    point.x = centre;
    point.y = -p.limit * s_bias;
    low = std::min(low, point.y);
    high = std::max(high, point.y);
    mark.points.push_back(point);
    f.series.push_back(std::move(mark));
    f.marks.push_back({fmt::format("{}bias/drive = {} {}", kMinus, short_text(centre, 3), in_unit),
                       true, centre});
  }
  const bool no_bias = best.bias.low95 <= 0.0 && best.bias.high95 >= 0.0;
  f.note =
      unit_label(data) + " · " +
      (no_bias ? std::string(
                     "rest (0, 0) sits at the curve's centre of symmetry within the uncertainty")
               : fmt::format("rest (0, 0) sits {} {} {} the curve's centre of symmetry",
                             short_text(std::abs(centre), 3), in_unit,
                             centre <= 0.0 ? "above" : "below"));
  f.y.low = low - 0.02 * span;
  f.y.high = high + 0.02 * span;
  f.caption = fmt::format(
      "The {}, S(z) = {}, over the range driven at {} Hz ({} {} peak), given upright. Rest, where "
      "the unit idles, is at 0, 0; the curve's centre of symmetry is at input {}bias/drive = {} "
      "{}{}: the distance is the bias, referred to the input. Dashed: the gain at rest.",
      best.family->title, best.family->formula, short_text(fit_hz, 6), short_text(top, 3), in_unit,
      kMinus, short_text(centre, 3), in_unit, centre_in_sight ? "" : ", outside this figure");
  return f;
}

// --- balance

Figure balance_figure(const ReportData& data) {
  Figure f =
      start("balance", "Even and odd harmonics", conditions_line(data), data, "even over odd, dB");
  int colour = 0;
  for (double hz : frequencies_of(data.curves.levels)) {
    Series s;
    s.label = frequency_text(hz);
    s.colour = colour++;
    for (const auto& p : at_frequency(data.curves.levels, hz)) {
      if (!p.even_odd_db || p.flag == Flag::noise) continue;
      FigurePoint point;
      point.x = p.drive;
      point.y = *p.even_odd_db;
      point.doubtful = p.flag != Flag::none;
      if (p.even_odd_u_db) {
        point.low = point.y - *p.even_odd_u_db;
        point.high = point.y + *p.even_odd_u_db;
      }
      s.points.push_back(point);
    }
    f.series.push_back(std::move(s));
  }
  f.marks.push_back({"equal", false, 0.0});
  f.caption =
      "20 log10 of the root sum of squares of H2, H4, ... over that of H3, H5, ...: above 0 dB the "
      "even orders are the stronger. Drawn where both stand above the noise; bars: 95 % interval "
      "where visible.";
  return f;
}

}  // namespace

std::vector<Figure> report_figures(const ReportData& data) {
  std::vector<Figure> figures;
  const auto add = [&](Figure f) {
    if (has_points(f)) figures.push_back(std::move(f));
  };
  const double fit_hz = fit_frequency(data);
  add(harmonics_figure(data, fit_hz));
  add(thd_figure(data, fit_hz));
  add(compression_figure(data));
  for (Figure& f : two_tone_figures(data)) add(std::move(f));
  if (data.model) add(transfer_figure(data, fit_hz));
  add(balance_figure(data));
  for (Figure& f : method_figures(data)) figures.push_back(std::move(f));
  for (Figure& f : surface_figures(data)) figures.push_back(std::move(f));
  return figures;
}

}  // namespace kneeprint
