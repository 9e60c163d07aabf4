// SPDX-License-Identifier: GPL-3.0-or-later
// Lettering on a Cairo surface: faces, widths, word wrap. Sizes and widths in user units (points).
#pragma once

#include <string>
#include <vector>

#include "figure/palette.h"

typedef struct _cairo cairo_t;

namespace kneeprint {

struct TextStyle {
  double size = 10.0;
  bool bold = false;
  bool slanted = false;
  Colour colour = kInk;
};

/// Vertical measures of a style: distance of baselines, and the part of it above the baseline.
inline double line_height(const TextStyle& style) { return 1.35 * style.size; }
inline double ascent(const TextStyle& style) { return 0.93 * style.size; }

double text_width(cairo_t* context, const std::string& text, const TextStyle& style);
/// Left end of the baseline at (x, y).
void draw_text(cairo_t* context, const std::string& text, double x, double y,
               const TextStyle& style);
/// The same with a rim in the paper's colour, to stay readable over lines.
void draw_text_haloed(cairo_t* context, const std::string& text, double x, double y,
                      const TextStyle& style);

/// Lines no wider than `width`; breaks at spaces, and inside a word only where it alone is too
/// wide. At least one line, which may be empty.
std::vector<std::string> wrap_text(cairo_t* context, const std::string& text, double width,
                                   const TextStyle& style);
/// The text, cut and closed with an ellipsis where it is wider than `width`.
std::string fit_text(cairo_t* context, const std::string& text, double width,
                     const TextStyle& style);

void set_colour(cairo_t* context, const Colour& colour, double opacity = 1.0);

}  // namespace kneeprint
