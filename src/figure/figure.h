// SPDX-License-Identifier: GPL-3.0-or-later
// A figure described once; painters draw it (Cairo for pages; the screen's painter comes with the
// desk).
#pragma once

#include <optional>
#include <string>
#include <utility>
#include <vector>

namespace kneeprint {

struct FigurePoint {
  double x = 0.0, y = 0.0;
  std::optional<double> low, high;  ///< 95 % interval in y
  bool upper_limit = false;         ///< drawn as an arrow down from y
  bool doubtful = false;            ///< flagged: its marker is hollow
};

enum class SeriesStyle { line, markers, line_and_markers, dashed };

struct Series {
  std::string label;  ///< legend; stands beside the line's end where there is room
  SeriesStyle style = SeriesStyle::line_and_markers;
  int colour = 0;  ///< index into the palette; never the only distinction: marker and dash vary too
  std::vector<FigurePoint> points;
  bool label_at_point = false;  ///< a single point named where it stands, not in the margin
};

struct Band {  ///< shaded between low and high, e.g. the rig floor
  std::string label;
  std::vector<FigurePoint> points;  ///< high set; an empty low reaches the end of the axis
};

/// One measured place of a surface.
struct SurfaceCell {
  double x = 0.0, y = 0.0;
  double value = 0.0;
  std::string text;          ///< printed in the cell where it fits
  bool upper_limit = false;  ///< the text says so; the cell is coloured as the value
  bool doubtful = false;     ///< flagged: struck through
};

/// A value over two axes, as a map of cells that reach half way to their neighbours. Colour runs
/// from light (low) to dark (high) in steps that the legend names.
struct Surface {
  bool logarithmic = false;
  std::vector<SurfaceCell> cells;
};

struct Mark {  ///< a labelled line at a value
  std::string label;
  bool vertical = true;
  double at = 0.0;
};

struct Axis {
  std::string label;                ///< with unit: "drive, dBu"
  std::optional<double> low, high;  ///< else from the data
  bool logarithmic = false;
};

struct Figure {
  std::string id;  ///< file stem
  std::string title;
  std::string note;  ///< one line under the title: conditions
  std::string
      caption;  ///< what is shown and how it is defined; set below the figure, not painted in it
  Axis x, y;
  std::vector<Series> series;
  std::vector<Band> bands;
  std::vector<Mark> marks;
  std::optional<Surface> surface;
};

}  // namespace kneeprint
