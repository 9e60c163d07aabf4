// SPDX-License-Identifier: GPL-3.0-or-later
#include "figure/cairo_painter.h"

#include <cairo-svg.h>
#include <cairo.h>

#include <algorithm>
#include <cmath>
#include <memory>
#include <numbers>

#include "figure/axis_map.h"
#include "figure/cairo_text.h"
#include "figure/palette.h"
#include "figure/spread.h"
#include "figure/surface_painter.h"
#include "figure/svg_text.h"
#include "figure/ticks.h"
#include "quantity/failure.h"

namespace kneeprint {
namespace {

constexpr TextStyle kTitle{13.5, true, false, kInk};
constexpr TextStyle kNote{9.5, false, false, kSoftInk};
constexpr TextStyle kAxisName{9.5, false, false, kInk};
constexpr TextStyle kTickText{9.0, false, false, kSoftInk};
constexpr TextStyle kLabel{9.5, false, false, kInk};
constexpr TextStyle kMarkText{8.5, false, true, kSoftInk};
constexpr double kMargin = 14.0;
constexpr double kSample = 22.0;  ///< length of the line sample before a label
constexpr double kMarker = 3.1;   ///< radius
constexpr double kArrow = 13.0;
constexpr double kLoneBand = 8.0;  ///< half width of a band known at one drive alone

class Painter {
 public:
  Painter(cairo_t* context, const Figure& figure, FigureSize size)
      : cr_(context), figure_(figure), size_(size) {}

  void paint();

 private:
  void layout();
  void draw_grid();
  void draw_bands();
  void draw_band_labels();
  void draw_marks();
  void draw_series(const Series& series);
  void draw_line(const Series& series);
  void draw_points(const Series& series);
  void draw_marker(double x, double y, const SeriesLook& look, bool hollow);
  void draw_arrow(double x, double y, const SeriesLook& look);
  void draw_labels();
  void draw_label_at(const std::string& label, double x, double y);
  void set_dash(const Series& series);
  void hairline(double x1, double y1, double x2, double y2);
  bool crossed_by_a_line(const Box& box) const;
  bool in_sight(const FigurePoint& p) const { return x_.covers(p.x) && y_.covers(p.y); }

  cairo_t* cr_;
  const Figure& figure_;
  FigureSize size_;
  AxisMap x_, y_;
  std::vector<Tick> x_ticks_, y_ticks_;
  std::vector<std::string> note_;
  Box plot_{};
};

double label_width(cairo_t* cr, const Series& s) {
  return kSample + 5.0 + text_width(cr, s.label, kLabel);
}

bool has_markers(const Series& s) {
  return s.style == SeriesStyle::markers || s.style == SeriesStyle::line_and_markers;
}

void Painter::layout() {
  double right = kMargin;
  for (const auto& s : figure_.series)
    if (!s.label.empty() && !s.label_at_point)
      right = std::max(right, 12.0 + label_width(cr_, s) + kMargin / 2);
  if (figure_.surface)
    right = std::max(right, 12.0 + surface_legend_width(cr_, *figure_.surface) + kMargin / 2);
  right = std::min(right, 0.36 * size_.width);
  note_ = figure_.note.empty() ? std::vector<std::string>{}
                               : wrap_text(cr_, figure_.note, size_.width - 2 * kMargin, kNote);

  plot_.top = kMargin + line_height(kTitle) +
              static_cast<double>(note_.size()) * line_height(kNote) + 10.0 +
              line_height(kAxisName) + 2.0;
  plot_.bottom = size_.height - kMargin - 2.0 * line_height(kTickText) - 2.0;
  plot_.right = size_.width - right;

  const int rows = std::max(3, static_cast<int>((plot_.bottom - plot_.top) / 34.0));
  y_ = y_axis_map(figure_, rows);
  y_ticks_ = y_.ticks(rows);
  double widest = 0.0;
  for (const auto& t : y_ticks_) widest = std::max(widest, text_width(cr_, t.label, kTickText));
  plot_.left = kMargin + widest + 7.0;

  const int columns = std::max(3, static_cast<int>((plot_.right - plot_.left) / 52.0));
  x_ = x_axis_map(figure_, columns);
  x_ticks_ = x_.ticks(columns);
  x_.place(plot_.left, plot_.right);
  y_.place(plot_.bottom, plot_.top);
}

void Painter::hairline(double x1, double y1, double x2, double y2) {
  cairo_move_to(cr_, x1, y1);
  cairo_line_to(cr_, x2, y2);
  cairo_stroke(cr_);
}

void Painter::draw_grid() {
  const auto grid_look = [&](const Tick& t) {
    set_colour(cr_, t.label.empty() ? kFaintGrid : kGrid);
    cairo_set_line_width(cr_, t.label.empty() ? 0.5 : 0.7);
  };
  for (bool labelled : {false, true}) {  // the faint ones stay below
    for (const auto& t : x_ticks_)
      if (t.label.empty() != labelled) {
        grid_look(t);
        hairline(x_.at(t.at), plot_.top, x_.at(t.at), plot_.bottom);
      }
    for (const auto& t : y_ticks_)
      if (t.label.empty() != labelled) {
        grid_look(t);
        hairline(plot_.left, y_.at(t.at), plot_.right, y_.at(t.at));
      }
  }
}

void Painter::draw_bands() {
  for (const auto& band : figure_.bands) {
    std::vector<const FigurePoint*> points;
    for (const auto& p : band.points)
      if (p.high && x_.usable(p.x) && y_.usable(*p.high)) points.push_back(&p);
    if (points.empty()) continue;
    const auto top = [&](const FigurePoint& p) { return y_.at_clamped(*p.high); };
    const auto bottom = [&](const FigurePoint& p) {
      return p.low && y_.usable(*p.low) ? y_.at_clamped(*p.low) : plot_.bottom;
    };
    // A band known at one drive alone is drawn as a short block there.
    const double half = points.size() == 1 ? kLoneBand : 0.0;
    cairo_new_path(cr_);
    for (const auto* p : points) {
      cairo_line_to(cr_, x_.at(p->x) - half, top(*p));
      cairo_line_to(cr_, x_.at(p->x) + half, top(*p));
    }
    for (auto p = points.rbegin(); p != points.rend(); ++p) {
      cairo_line_to(cr_, x_.at((*p)->x) + half, bottom(**p));
      cairo_line_to(cr_, x_.at((*p)->x) - half, bottom(**p));
    }
    cairo_close_path(cr_);
    set_colour(cr_, kShade);
    cairo_fill(cr_);
  }
}

void Painter::draw_band_labels() {
  for (const auto& band : figure_.bands) {
    const double width = text_width(cr_, band.label, kMarkText);
    // Where the band is thickest, if it is thick enough there.
    double thickest = 1.3 * kMarkText.size, x = 0.0, y = 0.0;
    for (const auto& p : band.points) {
      if (!p.high || !x_.usable(p.x) || !y_.usable(*p.high)) continue;
      const double bottom = p.low && y_.usable(*p.low) ? y_.at_clamped(*p.low) : plot_.bottom;
      if (bottom - y_.at_clamped(*p.high) <= thickest) continue;
      thickest = bottom - y_.at_clamped(*p.high);
      x = x_.at(p.x) + (band.points.size() == 1 ? kLoneBand + 4.0 : 4.0);
      y = bottom - 4.0;
    }
    if (y > 0.0)
      draw_text(cr_, band.label, std::clamp(x, plot_.left + 4.0, plot_.right - width - 4.0), y,
                kMarkText);
  }
}

bool Painter::crossed_by_a_line(const Box& box) const {
  const auto inside = [&](double x, double y) {
    return x > box.left && x < box.right && y > box.top && y < box.bottom;
  };
  for (const auto& s : figure_.series)
    for (std::size_t i = 0; i < s.points.size(); ++i) {
      const FigurePoint &a = s.points[i == 0 ? 0 : i - 1], &b = s.points[i];
      if (!x_.usable(a.x) || !y_.usable(a.y) || !x_.usable(b.x) || !y_.usable(b.y)) continue;
      const double x1 = x_.at(a.x), y1 = y_.at(a.y), x2 = x_.at(b.x), y2 = y_.at(b.y);
      const int steps = 1 + static_cast<int>(std::min(200.0, std::hypot(x2 - x1, y2 - y1) / 3.0));
      for (int k = 0; k <= steps; ++k)
        if (inside(x1 + (x2 - x1) * k / steps, y1 + (y2 - y1) * k / steps)) return true;
    }
  return false;
}

void Painter::draw_marks() {
  std::vector<std::pair<double, double>> taken;  // x extents of vertical labels, by row
  std::vector<int> rows;
  for (const auto& m : figure_.marks) {
    const AxisMap& axis = m.vertical ? x_ : y_;
    if (!axis.usable(m.at) || !axis.covers(m.at)) continue;
    const double at = axis.at(m.at);
    const double width = text_width(cr_, m.label, kMarkText);
    cairo_save(cr_);
    set_colour(cr_, kSoftInk, 0.8);
    cairo_set_line_width(cr_, 0.8);
    const double dash[] = {2.0, 2.5};
    cairo_set_dash(cr_, dash, 2, 0.0);
    if (m.vertical)
      hairline(at, plot_.top, at, plot_.bottom);
    else
      hairline(plot_.left, at, plot_.right, at);
    cairo_restore(cr_);
    if (!m.vertical) {
      // Above the line at the left, unless a curve passes there and another corner is free.
      const double left = plot_.left + 5.0, right = plot_.right - width - 5.0;
      const double above = at - 3.0, below = at + kMarkText.size + 2.0;
      std::pair<double, double> place{left, above};
      for (const auto& [x, y] : {std::pair{left, above}, std::pair{right, above},
                                 std::pair{left, below}, std::pair{right, below}}) {
        const Box box{x - 3.0, y - kMarkText.size - 2.0, x + width + 3.0, y + 3.0};
        if (box.top < plot_.top || box.bottom > plot_.bottom || crossed_by_a_line(box)) continue;
        place = {x, y};
        break;
      }
      draw_text_haloed(cr_, m.label, place.first, place.second, kMarkText);
      continue;
    }
    const double x = at + 5.0 + width < plot_.right ? at + 4.0 : at - 4.0 - width;
    int row = 0;
    for (std::size_t i = 0; i < taken.size();) {
      const bool clash =
          rows[i] == row && x < taken[i].second + 6.0 && x + width > taken[i].first - 6.0;
      if (clash) {
        ++row;
        i = 0;
      } else {
        ++i;
      }
    }
    taken.emplace_back(x, x + width);
    rows.push_back(row);
    draw_text_haloed(cr_, m.label, x,
                     plot_.top + kMarkText.size + 3.0 + row * line_height(kMarkText), kMarkText);
  }
}

void Painter::set_dash(const Series& series) {
  const auto& dash = look(series.colour).dash;
  const double dashed[] = {5.0, 3.5};
  if (series.style == SeriesStyle::dashed)
    cairo_set_dash(cr_, dashed, 2, 0.0);
  else if (series.style == SeriesStyle::line && dash[0] > 0.0)
    cairo_set_dash(cr_, dash.data(), 4, 0.0);
  else
    cairo_set_dash(cr_, nullptr, 0, 0.0);  // markers tell these lines apart
}

void Painter::draw_line(const Series& series) {
  cairo_new_path(cr_);
  bool pen_down = false;
  for (const auto& p : series.points) {
    if (p.upper_limit || !x_.usable(p.x) || !y_.usable(p.y)) {
      pen_down = false;
      continue;
    }
    if (pen_down)
      cairo_line_to(cr_, x_.at(p.x), y_.at_bounded(p.y));
    else
      cairo_move_to(cr_, x_.at(p.x), y_.at_bounded(p.y));
    pen_down = true;
  }
  set_dash(series);
  set_colour(cr_, look(series.colour).colour);
  cairo_set_line_width(cr_, has_markers(series) ? 1.1 : 1.5);
  cairo_stroke(cr_);
  cairo_set_dash(cr_, nullptr, 0, 0.0);
}

void Painter::draw_marker(double x, double y, const SeriesLook& l, bool hollow) {
  const auto polygon = [&](std::initializer_list<std::pair<double, double>> corners) {
    cairo_new_path(cr_);
    for (const auto& [dx, dy] : corners) cairo_line_to(cr_, x + kMarker * dx, y + kMarker * dy);
    cairo_close_path(cr_);
  };
  cairo_new_path(cr_);
  switch (l.marker) {
    case MarkerShape::disc:
      cairo_arc(cr_, x, y, kMarker * 0.95, 0.0, 2.0 * std::numbers::pi);
      cairo_close_path(cr_);
      break;
    case MarkerShape::square:
      polygon({{-0.85, -0.85}, {0.85, -0.85}, {0.85, 0.85}, {-0.85, 0.85}});
      break;
    case MarkerShape::triangle:
      polygon({{0.0, -1.15}, {1.05, 0.75}, {-1.05, 0.75}});
      break;
    case MarkerShape::diamond:
      polygon({{0.0, -1.25}, {1.05, 0.0}, {0.0, 1.25}, {-1.05, 0.0}});
      break;
    case MarkerShape::inverted_triangle:
      polygon({{0.0, 1.15}, {1.05, -0.75}, {-1.05, -0.75}});
      break;
    case MarkerShape::pentagon:
      polygon({{0.0, -1.1}, {1.05, -0.34}, {0.65, 0.89}, {-0.65, 0.89}, {-1.05, -0.34}});
      break;
    case MarkerShape::cross:
      set_colour(cr_, hollow ? kSoftInk : l.colour);
      cairo_set_line_width(cr_, 1.3);
      hairline(x - kMarker, y - kMarker, x + kMarker, y + kMarker);
      hairline(x - kMarker, y + kMarker, x + kMarker, y - kMarker);
      return;
  }
  set_colour(cr_, hollow ? kPaper : l.colour);
  cairo_fill_preserve(cr_);
  set_colour(cr_, l.colour);
  cairo_set_line_width(cr_, hollow ? 1.1 : 0.6);
  cairo_stroke(cr_);
}

void Painter::draw_arrow(double x, double y, const SeriesLook& l) {
  set_colour(cr_, l.colour, 0.8);
  cairo_set_line_width(cr_, 0.8);
  hairline(x - kMarker, y, x + kMarker, y);
  hairline(x, y, x, y + kArrow - 3.5);
  cairo_new_path(cr_);
  cairo_move_to(cr_, x - 2.0, y + kArrow - 4.5);
  cairo_line_to(cr_, x + 2.0, y + kArrow - 4.5);
  cairo_line_to(cr_, x, y + kArrow);
  cairo_close_path(cr_);
  cairo_fill(cr_);
}

void Painter::draw_points(const Series& series) {
  const SeriesLook& l = look(series.colour);
  for (const auto& p : series.points) {
    if (p.upper_limit || !x_.usable(p.x) || !y_.usable(p.y) || !in_sight(p)) continue;
    if (!p.low && !p.high) continue;
    const double x = x_.at(p.x), y = y_.at(p.y);
    const auto end = [&](const std::optional<double>& v, double outside) {
      return !v ? y : y_.usable(*v) ? y_.at_clamped(*v) : outside;
    };
    const double low = end(p.low, plot_.bottom), high = end(p.high, plot_.top);
    if (low - high < 2.0 * kMarker + 2.0) continue;  // hidden by the marker
    set_colour(cr_, l.colour);
    cairo_set_line_width(cr_, 0.9);
    hairline(x, low, x, high);
    if (low < plot_.bottom) hairline(x - 2.2, low, x + 2.2, low);
    hairline(x - 2.2, high, x + 2.2, high);
  }
  for (const auto& p : series.points) {
    if (!x_.usable(p.x) || !y_.usable(p.y) || !in_sight(p)) continue;
    if (p.upper_limit)
      draw_arrow(x_.at(p.x), y_.at(p.y), l);
    else if (has_markers(series))
      draw_marker(x_.at(p.x), y_.at(p.y), l, p.doubtful);
  }
}

void Painter::draw_series(const Series& series) {
  if (series.style != SeriesStyle::markers) {
    cairo_save(cr_);
    cairo_rectangle(cr_, plot_.left, plot_.top, plot_.right - plot_.left, plot_.bottom - plot_.top);
    cairo_clip(cr_);
    draw_line(series);
    cairo_restore(cr_);
  }
  draw_points(series);
}

/// Below and right of the point, unless a line passes there and the other side is free.
void Painter::draw_label_at(const std::string& label, double x, double y) {
  const double width = text_width(cr_, label, kLabel);
  const std::pair<double, double> places[] = {{x + 9.0, y + 13.0}, {x - 9.0 - width, y - 6.0}};
  auto place = places[0];
  for (const auto& [left, base] : places) {
    const Box box{left - 2.0, base - kLabel.size, left + width + 2.0, base + 2.0};
    if (box.left < plot_.left || box.right > plot_.right || crossed_by_a_line(box)) continue;
    place = {left, base};
    break;
  }
  draw_text_haloed(cr_, label, place.first, place.second, kLabel);
}

void Painter::draw_labels() {
  struct Label {
    const Series* series;
    double x, y;  ///< the end of the line
  };
  std::vector<Label> labels;
  std::vector<double> wanted;
  for (const auto& s : figure_.series) {
    const FigurePoint* last = nullptr;
    for (const auto& p : s.points)
      if (x_.usable(p.x) && y_.usable(p.y) && in_sight(p) && (!last || p.x >= last->x)) last = &p;
    if (!last || s.label.empty()) continue;
    if (s.label_at_point) {
      draw_label_at(s.label, x_.at(last->x), y_.at(last->y));
      continue;
    }
    labels.push_back({&s, x_.at(last->x), y_.at(last->y)});
    wanted.push_back(labels.back().y);
  }
  const auto placed =
      spread_labels(wanted, line_height(kLabel), plot_.top + 2.0, plot_.bottom - 4.0);
  const double left = plot_.right + 12.0;
  for (std::size_t i = 0; i < labels.size(); ++i) {
    const Series& s = *labels[i].series;
    const SeriesLook& l = look(s.colour);
    cairo_save(cr_);
    set_colour(cr_, l.colour, 0.45);
    cairo_set_line_width(cr_, 0.6);
    hairline(labels[i].x + kMarker + 2.0, labels[i].y, left - 3.0, placed[i]);
    set_colour(cr_, l.colour);
    if (s.style != SeriesStyle::markers) {
      set_dash(s);
      cairo_set_line_width(cr_, has_markers(s) ? 1.1 : 1.5);
      hairline(left, placed[i], left + kSample, placed[i]);
    }
    cairo_restore(cr_);
    if (has_markers(s)) draw_marker(left + kSample / 2, placed[i], l, false);
    const double x = left + kSample + 5.0;
    draw_text(cr_, fit_text(cr_, s.label, size_.width - x - 2.0, kLabel), x,
              placed[i] + 0.36 * kLabel.size, kLabel);
  }
}

void Painter::paint() {
  cairo_save(cr_);
  set_colour(cr_, kPaper);
  cairo_rectangle(cr_, 0.0, 0.0, size_.width, size_.height);
  cairo_fill(cr_);
  cairo_set_line_join(cr_, CAIRO_LINE_JOIN_ROUND);
  layout();

  double y = kMargin + ascent(kTitle);
  draw_text(cr_, fit_text(cr_, figure_.title, size_.width - 2 * kMargin, kTitle), kMargin, y,
            kTitle);
  y += line_height(kNote) + 3.0;
  for (const auto& line : note_) {
    draw_text(cr_, line, kMargin, y, kNote);
    y += line_height(kNote);
  }
  draw_text(cr_, figure_.y.label, kMargin, plot_.top - 8.0, kAxisName);

  draw_bands();
  draw_grid();
  if (figure_.surface) paint_surface(cr_, figure_, x_, y_, plot_, plot_.right + 12.0);
  draw_band_labels();
  draw_marks();
  set_colour(cr_, kSoftInk);
  cairo_set_line_width(cr_, 0.9);
  hairline(plot_.left, plot_.bottom, plot_.right, plot_.bottom);
  for (const auto& t : y_ticks_)
    draw_text(cr_, t.label, plot_.left - 6.0 - text_width(cr_, t.label, kTickText),
              y_.at(t.at) + 0.36 * kTickText.size, kTickText);
  for (const auto& t : x_ticks_) {
    if (t.label.empty()) continue;
    set_colour(cr_, kSoftInk);
    hairline(x_.at(t.at), plot_.bottom, x_.at(t.at), plot_.bottom + 3.5);
    draw_text(cr_, t.label, x_.at(t.at) - text_width(cr_, t.label, kTickText) / 2,
              plot_.bottom + 5.0 + ascent(kTickText), kTickText);
  }
  draw_text(cr_, figure_.x.label, plot_.right - text_width(cr_, figure_.x.label, kAxisName),
            size_.height - kMargin, kAxisName);
  for (const auto& s : figure_.series) draw_series(s);
  draw_labels();

  const bool empty =
      !figure_.surface && std::none_of(figure_.series.begin(), figure_.series.end(),
                                       [](const Series& s) { return !s.points.empty(); });
  if (empty)
    draw_text(cr_, "no data",
              (plot_.left + plot_.right) / 2 - text_width(cr_, "no data", kNote) / 2,
              (plot_.top + plot_.bottom) / 2, kNote);
  cairo_restore(cr_);
}

struct SurfaceDeleter {
  void operator()(cairo_surface_t* s) const { cairo_surface_destroy(s); }
};
struct ContextDeleter {
  void operator()(cairo_t* c) const { cairo_destroy(c); }
};
using CairoSurface = std::unique_ptr<cairo_surface_t, SurfaceDeleter>;
using Context = std::unique_ptr<cairo_t, ContextDeleter>;

cairo_status_t append(void* text, const unsigned char* bytes, unsigned int count) {
  static_cast<std::string*>(text)->append(reinterpret_cast<const char*>(bytes), count);
  return CAIRO_STATUS_SUCCESS;
}

}  // namespace

void paint(cairo_t* context, const Figure& figure, FigureSize size) {
  Painter(context, figure, size).paint();
}

std::string svg(const Figure& figure, FigureSize size) {
  std::string text;
  CairoSurface surface(cairo_svg_surface_create_for_stream(append, &text, size.width, size.height));
  {
    Context context(cairo_create(surface.get()));
    paint(context.get(), figure, size);
  }
  cairo_surface_finish(surface.get());
  return embeddable_svg(text, figure.id, figure.title, size.width, size.height);
}

void write_png(const Figure& figure, const std::filesystem::path& file, FigureSize size,
               double scale) {
  CairoSurface surface(cairo_image_surface_create(
      CAIRO_FORMAT_RGB24, static_cast<int>(std::lround(size.width * scale)),
      static_cast<int>(std::lround(size.height * scale))));
  {
    Context context(cairo_create(surface.get()));
    cairo_scale(context.get(), scale, scale);
    paint(context.get(), figure, size);
  }
  const cairo_status_t status = cairo_surface_write_to_png(surface.get(), file.string().c_str());
  if (status != CAIRO_STATUS_SUCCESS)
    throw InputError(file.string() +
                     ": cannot write the picture: " + cairo_status_to_string(status));
}

}  // namespace kneeprint
