// SPDX-License-Identifier: GPL-3.0-or-later
#include "report/pdf_page.h"

#include <cairo-pdf.h>
#include <cairo.h>
#include <fmt/format.h>

#include <algorithm>
#include <functional>
#include <memory>
#include <regex>

#include "figure/cairo_painter.h"
#include "figure/cairo_text.h"
#include "figure/utf8.h"
#include "quantity/failure.h"

namespace kneeprint {
namespace {

constexpr double kWidth = 595.276, kHeight = 841.890;  ///< A4 in points
constexpr double kSide = 48.0, kTop = 50.0, kBottom = 58.0;
constexpr double kColumn = kWidth - 2.0 * kSide;
/// Two figures with their captions share a page.
constexpr FigureSize kFigure{640.0, 400.0};
constexpr double kFigureScale = kColumn / kFigure.width;

constexpr TextStyle kTitle{19.0, true, false, kInk};
constexpr TextStyle kLongTitle{13.0, true, false, kInk};
constexpr TextStyle kHeading{12.0, true, false, kInk};
constexpr TextStyle kBody{8.8, false, false, kInk};
constexpr TextStyle kStrong{8.8, true, false, kInk};
constexpr TextStyle kSmall{7.6, false, false, kSoftInk};
constexpr TextStyle kCell{7.6, false, false, kInk};
constexpr TextStyle kCellHead{7.6, true, false, kInk};

using Ink = std::function<void(cairo_t*)>;

/// Lays the page out from top to bottom; what to draw is kept by sheet, so the number of sheets is
/// known when they are drawn.
class PdfSetter {
 public:
  explicit PdfSetter(cairo_t* ruler) : ruler_(ruler) { new_sheet(); }

  void operator()(const Paragraph& p) {
    lines(wrap_text(ruler_, p.text, kColumn, kBody), kSide, kBody);
    y_ += 4.0;
  }

  void operator()(const Notice& n) {
    const double inset = 10.0;
    auto title = wrap_text(ruler_, n.title, kColumn - 2 * inset, kStrong);
    auto text = wrap_text(ruler_, n.text, kColumn - 2 * inset, kBody);
    const double height =
        static_cast<double>(title.size() + text.size()) * line_height(kBody) + 9.0;
    need(height + 6.0);
    const double top = y_;
    draw([=](cairo_t* cr) {
      set_colour(cr, rgb(0xb8501f));
      cairo_rectangle(cr, kSide, top, 3.5, height);
      cairo_fill(cr);
      cairo_set_line_width(cr, 0.6);
      cairo_rectangle(cr, kSide, top, kColumn, height);
      cairo_stroke(cr);
    });
    y_ += 4.0;
    lines(title, kSide + inset, kStrong);
    lines(text, kSide + inset, kBody);
    y_ = top + height + 6.0;
  }

  void operator()(const Definitions& d) {
    const double term_width = 0.25 * kColumn;
    for (const auto& [term, text] : d.entries) {
      TextStyle soft = kBody;
      soft.colour = kSoftInk;
      const auto left = wrap_text(ruler_, term, term_width - 10.0, soft);
      const auto right = wrap_text(ruler_, text, kColumn - term_width, kBody);
      const auto rows = std::max(left.size(), right.size());
      need(static_cast<double>(std::min<std::size_t>(rows, 3)) * line_height(kBody));
      for (std::size_t i = 0; i < rows; ++i) {
        need(line_height(kBody));
        const double at = y_ + ascent(kBody);
        if (i < left.size()) put(left[i], kSide, at, soft);
        if (i < right.size()) put(right[i], kSide + term_width, at, kBody);
        y_ += line_height(kBody);
      }
      y_ += 2.0;
    }
    y_ += 4.0;
  }

  void operator()(const Table& t) {
    if (!t.caption.empty()) {
      need(5.0 * line_height(kCell));
      lines(wrap_text(ruler_, t.caption, kColumn, kSmall), kSide, kSmall);
      y_ += 3.0;
    }
    const auto widths = column_widths(t);
    row(t, t.heads, widths, kCellHead, true);
    for (const auto& r : t.rows) {
      if (y_ + 2.0 * line_height(kCell) > kHeight - kBottom) {
        new_sheet();
        row(t, t.heads, widths, kCellHead, true);
      }
      row(t, r, widths, kCell, false);
    }
    y_ += 8.0;
  }

  void operator()(const Figure& f) {
    const auto caption = wrap_text(ruler_, f.caption, kColumn, kSmall);
    const double height = kFigure.height * kFigureScale;
    need(height + 5.0 + static_cast<double>(caption.size()) * line_height(kSmall));
    const double top = y_;
    draw([f, top](cairo_t* cr) {
      cairo_save(cr);
      cairo_translate(cr, kSide, top);
      cairo_scale(cr, kFigureScale, kFigureScale);
      paint(cr, f, kFigure);
      cairo_restore(cr);
    });
    y_ += height + 5.0;
    lines(caption, kSide, kSmall);
    y_ += 14.0;
  }

  void heading(const std::string& text, const TextStyle& style) {
    for (const auto& line : wrap_text(ruler_, text, kColumn, style)) {
      need(line_height(style));
      put(line, kSide, y_ + ascent(style), style);
      y_ += line_height(style);
    }
  }

  void title(const Page& page) {
    // A long name of a unit must not fill the sheet.
    const bool is_long = wrap_text(ruler_, page.title, kColumn, kTitle).size() > 2;
    heading(page.title, is_long ? kLongTitle : kTitle);
    y_ += 2.0;
    lines(wrap_text(ruler_, page.subtitle, kColumn, kSmall), kSide, kSmall);
    const double at = y_ + 4.0;
    draw([at](cairo_t* cr) {
      set_colour(cr, kInk);
      cairo_set_line_width(cr, 1.2);
      cairo_move_to(cr, kSide, at);
      cairo_line_to(cr, kWidth - kSide, at);
      cairo_stroke(cr);
    });
    y_ += 14.0;
  }

  void section(const Section& s) {
    if (s.blocks.empty() || s.on_screen_only) return;
    if (!s.title.empty()) {
      const bool figure_next = std::holds_alternative<Figure>(s.blocks.front());
      need(figure_next ? kFigure.height * kFigureScale + 60.0 : 70.0);
      if (y_ > kTop) y_ += 8.0;
      heading(s.title, kHeading);
      y_ += 3.0;
    }
    for (const auto& block : s.blocks) std::visit(*this, block);
  }

  const std::vector<std::vector<Ink>>& sheets() const { return sheets_; }

 private:
  void new_sheet() {
    sheets_.emplace_back();
    y_ = kTop;
  }
  void need(double height) {
    if (y_ + height > kHeight - kBottom && y_ > kTop) new_sheet();
  }
  void draw(Ink ink) { sheets_.back().push_back(std::move(ink)); }
  void put(const std::string& text, double x, double y, const TextStyle& style) {
    draw([=](cairo_t* cr) { draw_text(cr, text, x, y, style); });
  }
  void lines(const std::vector<std::string>& text, double x, const TextStyle& style) {
    for (const auto& line : text) {
      need(line_height(style));
      put(line, x, y_ + ascent(style), style);
      y_ += line_height(style);
    }
  }

  static constexpr double kGap = 9.0;  ///< between columns

  /// As wide as the contents want; where that is too much, the widest columns give way.
  std::vector<double> column_widths(const Table& t) {
    std::vector<double> want(t.heads.size(), 0.0);
    const auto see = [&](const std::vector<std::string>& cells, const TextStyle& style) {
      for (std::size_t i = 0; i < cells.size() && i < want.size(); ++i)
        want[i] = std::max(want[i], text_width(ruler_, cells[i], style) + 0.5);
    };
    see(t.heads, kCellHead);
    for (const auto& r : t.rows) see(r, kCell);
    const double room = kColumn - kGap * static_cast<double>(want.size() - 1);
    double cap = room;
    const auto total = [&] {
      double sum = 0.0;
      for (double w : want) sum += std::min(w, cap);
      return sum;
    };
    while (total() > room && cap > 12.0) cap *= 0.98;
    for (double& w : want) w = std::min(w, cap);
    return want;
  }

  void row(const Table& t, const std::vector<std::string>& cells, const std::vector<double>& widths,
           const TextStyle& style, bool head) {
    std::vector<std::vector<std::string>> wrapped;
    std::size_t most = 1;
    for (std::size_t i = 0; i < widths.size(); ++i) {
      wrapped.push_back(wrap_text(ruler_, i < cells.size() ? cells[i] : "", widths[i], style));
      most = std::max(most, wrapped.back().size());
    }
    const double height = static_cast<double>(most) * line_height(style) + 4.0;
    need(head ? height + 3.0 * line_height(style) : height);
    double x = kSide;
    for (std::size_t i = 0; i < widths.size(); ++i) {
      const bool left = t.all_text || (i == 0 && t.first_column_is_text);
      const std::size_t lead = head ? most - wrapped[i].size() : 0;  // heads stand on their line
      for (std::size_t k = 0; k < wrapped[i].size(); ++k) {
        const double indent = left ? 0.0 : widths[i] - text_width(ruler_, wrapped[i][k], style);
        put(wrapped[i][k], x + indent,
            y_ + ascent(style) + static_cast<double>(k + lead) * line_height(style) + 1.0, style);
      }
      x += widths[i] + kGap;
    }
    y_ += height;
    const double at = y_ - 0.5, right = x - kGap;
    draw([=](cairo_t* cr) {
      set_colour(cr, head ? kInk : kGrid);
      cairo_set_line_width(cr, head ? 0.9 : 0.5);
      cairo_move_to(cr, kSide, at);
      cairo_line_to(cr, right, at);
      cairo_stroke(cr);
    });
  }

  cairo_t* ruler_;
  std::vector<std::vector<Ink>> sheets_;
  double y_ = 0.0;
};

struct SurfaceDeleter {
  void operator()(cairo_surface_t* s) const { cairo_surface_destroy(s); }
};
struct ContextDeleter {
  void operator()(cairo_t* c) const { cairo_destroy(c); }
};

cairo_status_t append(void* bytes, const unsigned char* more, unsigned int count) {
  static_cast<std::string*>(bytes)->append(reinterpret_cast<const char*>(more), count);
  return CAIRO_STATUS_SUCCESS;
}

/// Cairo ignores what it cannot read as a date and takes the clock instead.
std::string date_for_pdf(const std::string& utc) {
  static const std::regex whole(R"(\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d)");
  std::smatch found;
  return std::regex_search(utc, found, whole, std::regex_constants::match_continuous)
             ? found.str() + "Z"
             : "1970-01-01T00:00:00Z";
}

}  // namespace

std::string pdf_page(const Page& page) {
  std::string bytes;
  std::unique_ptr<cairo_surface_t, SurfaceDeleter> surface(
      cairo_pdf_surface_create_for_stream(append, &bytes, kWidth, kHeight));
  const std::string date = date_for_pdf(page.created);
  cairo_pdf_surface_set_metadata(surface.get(), CAIRO_PDF_METADATA_TITLE,
                                 printable_utf8(page.title).c_str());
  cairo_pdf_surface_set_metadata(surface.get(), CAIRO_PDF_METADATA_CREATE_DATE, date.c_str());
  cairo_pdf_surface_set_metadata(surface.get(), CAIRO_PDF_METADATA_MOD_DATE, date.c_str());
  {
    std::unique_ptr<cairo_t, ContextDeleter> context(cairo_create(surface.get()));
    cairo_t* cr = context.get();
    PdfSetter set(cr);
    set.title(page);
    for (const auto& s : page.sections) set.section(s);
    const auto& sheets = set.sheets();
    for (std::size_t i = 0; i < sheets.size(); ++i) {
      for (const auto& ink : sheets[i]) ink(cr);
      const std::string number = fmt::format("{} / {}", i + 1, sheets.size());
      const double y = kHeight - 30.0, width = text_width(cr, number, kSmall);
      draw_text(cr, fit_text(cr, page.title, kColumn - width - 20.0, kSmall), kSide, y, kSmall);
      draw_text(cr, number, kWidth - kSide - width, y, kSmall);
      cairo_show_page(cr);
    }
  }
  cairo_surface_finish(surface.get());
  const cairo_status_t status = cairo_surface_status(surface.get());
  if (status != CAIRO_STATUS_SUCCESS)
    throw Failure(ExitCode::bad_input,
                  std::string("the PDF could not be set: ") + cairo_status_to_string(status));
  return bytes;
}

}  // namespace kneeprint
