// SPDX-License-Identifier: GPL-3.0-or-later
// Paints figures on Cairo surfaces: SVG text for HTML pages, pages of a PDF, PNG for looking at.
// With cairo_text and surface_painter the only files in figure/ that see Cairo. Repeatable: the
// same figure gives the same bytes. Letters are drawn as outlines, so a page needs no font where it
// is read.
#pragma once

#include <filesystem>
#include <string>

#include "figure/figure.h"

typedef struct _cairo cairo_t;

namespace kneeprint {

struct FigureSize {
  double width = 720.0, height = 440.0;  ///< points
};

/// In the current user space of `context`, from (0, 0).
void paint(cairo_t* context, const Figure& figure, FigureSize size);
/// An <svg> element to stand inside HTML (no XML prologue; ids unique to the figure).
std::string svg(const Figure& figure, FigureSize size = {});
void write_png(const Figure& figure, const std::filesystem::path& file, FigureSize size = {},
               double scale = 2.0);

}  // namespace kneeprint
