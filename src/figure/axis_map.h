// SPDX-License-Identifier: GPL-3.0-or-later
// From data to a place on the page, along one axis.
#pragma once

#include <vector>

#include "figure/figure.h"
#include "figure/ticks.h"

namespace kneeprint {

class AxisMap {
 public:
  AxisMap() = default;
  AxisMap(AxisRange range, bool logarithmic) : range_(range), logarithmic_(logarithmic) {}

  /// Where the range's ends lie on the page.
  void place(double at_low, double at_high);
  std::vector<Tick> ticks(int most) const;
  const AxisRange& range() const { return range_; }

  bool usable(double v) const;  ///< finite, and above 0 on a logarithmic axis
  bool covers(double v) const;  ///< within the range, its ends included
  double at(double v) const;
  double at_clamped(double v) const;  ///< at the end of the axis when beyond it
  double at_bounded(
      double v) const;  ///< not further out than one axis length (painters' number range)

 private:
  double share(double v) const;
  AxisRange range_;
  bool logarithmic_ = false;
  double at_low_ = 0.0, at_high_ = 1.0;
};

/// The axis as the figure states it, else the data's range (points and bands, not intervals)
/// rounded outwards; a stated end is kept as it is.
AxisMap x_axis_map(const Figure& figure, int most_ticks);
AxisMap y_axis_map(const Figure& figure, int most_ticks);

}  // namespace kneeprint
