// SPDX-License-Identifier: GPL-3.0-or-later
// The cells and the legend of a surface.
#pragma once

#include "figure/axis_map.h"
#include "figure/figure.h"

typedef struct _cairo cairo_t;

namespace kneeprint {

struct Box {
  double left, top, right, bottom;
};

/// The steps of the colour scale: ascending bounds, one more than there are colours. Round numbers
/// where the range allows. Empty for a surface without cells.
std::vector<double> surface_steps(const Surface& surface);

/// Axis range that holds every cell with half a step around the outermost ones.
std::pair<double, double> surface_range(const std::vector<double>& positions, bool logarithmic);

/// Room that the legend takes beside the plot.
double surface_legend_width(cairo_t* cr, const Surface& surface);
void paint_surface(cairo_t* cr, const Figure& figure, const AxisMap& x, const AxisMap& y,
                   const Box& plot, double legend_left);

}  // namespace kneeprint
