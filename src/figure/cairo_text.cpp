// SPDX-License-Identifier: GPL-3.0-or-later
#include "figure/cairo_text.h"

#include <cairo.h>

#include "figure/utf8.h"

namespace kneeprint {
namespace {

void select(cairo_t* context, const TextStyle& style) {
  cairo_select_font_face(context, "sans-serif",
                         style.slanted ? CAIRO_FONT_SLANT_ITALIC : CAIRO_FONT_SLANT_NORMAL,
                         style.bold ? CAIRO_FONT_WEIGHT_BOLD : CAIRO_FONT_WEIGHT_NORMAL);
  cairo_set_font_size(context, style.size);
  // Without hinting a letter has the same width on every surface and at every scale.
  cairo_font_options_t* options = cairo_font_options_create();
  cairo_font_options_set_hint_style(options, CAIRO_HINT_STYLE_NONE);
  cairo_font_options_set_hint_metrics(options, CAIRO_HINT_METRICS_OFF);
  cairo_font_options_set_antialias(options, CAIRO_ANTIALIAS_GRAY);
  cairo_set_font_options(context, options);
  cairo_font_options_destroy(options);
}

}  // namespace

void set_colour(cairo_t* context, const Colour& c, double opacity) {
  cairo_set_source_rgba(context, c.red, c.green, c.blue, opacity);
}

double text_width(cairo_t* context, const std::string& text, const TextStyle& style) {
  select(context, style);
  cairo_text_extents_t extents;
  cairo_text_extents(context, printable_utf8(text).c_str(), &extents);
  return extents.x_advance;
}

void draw_text(cairo_t* context, const std::string& text, double x, double y,
               const TextStyle& style) {
  if (text.empty()) return;
  select(context, style);
  set_colour(context, style.colour);
  cairo_move_to(context, x, y);
  cairo_show_text(context, printable_utf8(text).c_str());
  cairo_new_path(context);
}

void draw_text_haloed(cairo_t* context, const std::string& text, double x, double y,
                      const TextStyle& style) {
  cairo_save(context);
  set_colour(context, kPaper, 0.85);
  cairo_rectangle(context, x - 2.0, y - ascent(style) + 0.5, text_width(context, text, style) + 4.0,
                  1.2 * style.size);
  cairo_fill(context);
  cairo_restore(context);
  draw_text(context, text, x, y, style);
}

std::vector<std::string> wrap_text(cairo_t* context, const std::string& text, double width,
                                   const TextStyle& style) {
  std::vector<std::string> lines{""};
  const auto fits = [&](const std::string& s) { return text_width(context, s, style) <= width; };
  for (const std::string& word : split_words(text)) {
    std::string& line = lines.back();
    const std::string longer = line.empty() ? word : line + " " + word;
    if (fits(longer)) {
      line = longer;
      continue;
    }
    if (!line.empty()) lines.emplace_back();
    std::string part;
    for (const std::string& letter : split_letters(word)) {
      if (!part.empty() && !fits(part + letter)) {
        lines.back() = part;
        lines.emplace_back();
        part.clear();
      }
      part += letter;
    }
    lines.back() = part;
  }
  return lines;
}

std::string fit_text(cairo_t* context, const std::string& text, double width,
                     const TextStyle& style) {
  if (text_width(context, text, style) <= width) return text;
  std::string kept;
  for (const std::string& letter : split_letters(text)) {
    if (text_width(context, kept + letter + "\u2026", style) > width) break;
    kept += letter;
  }
  return kept + "\u2026";
}

}  // namespace kneeprint
