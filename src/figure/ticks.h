// SPDX-License-Identifier: GPL-3.0-or-later
// Ticks at numbers a reader can count in: steps of 1, 2 or 5 times a power of ten on a linear axis,
// decades (and 2, 5 within few decades) on a logarithmic one.
#pragma once

#include <string>
#include <vector>

namespace kneeprint {

struct Tick {
  double at = 0.0;
  std::string label;  ///< empty: a minor tick, faint and unlabelled
};

struct AxisRange {
  double low = 0.0, high = 1.0;
};

/// Smallest of 1, 2, 5 times a power of ten that divides `span` (> 0) into at most `most` parts.
double tick_step(double span, int most);

/// Ticks within [low, high], low < high, ascending; at most `most` labelled gaps.
std::vector<Tick> linear_ticks(double low, double high, int most);
/// The same for a logarithmic axis, 0 < low < high.
std::vector<Tick> log_ticks(double low, double high, int most);

/// The range widened a little: linear to whole ticks, logarithmic to 1, 2 or 5 times a power of
/// ten.
AxisRange round_linear(AxisRange data, int most);
AxisRange round_log(AxisRange data);

/// "-6" with a true minus sign, no trailing zeros: "0.25".
std::string tick_label(double value, int decimals);

}  // namespace kneeprint
