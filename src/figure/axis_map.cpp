// SPDX-License-Identifier: GPL-3.0-or-later
#include "figure/axis_map.h"

#include <algorithm>
#include <cmath>
#include <limits>

namespace kneeprint {
namespace {

constexpr double kSlack = 1e-9;  ///< of the range: rounding must not push an end point out of it

enum class Ends { as_data, rounded };

/// Works in the axis's own measure: the logarithm on a logarithmic one.
class RangeFinder {
 public:
  explicit RangeFinder(const Axis& axis) : axis_(axis) {
    if (axis.low) see(*axis.low);
    if (axis.high) see(*axis.high);
  }
  void see(double v) {
    if (!std::isfinite(v) || (axis_.logarithmic && v <= 0.0)) return;
    low_ = std::min(low_, measure(v));
    high_ = std::max(high_, measure(v));
  }
  /// A band that is open below: some of it is to be seen.
  void see_top_of_band(double v) {
    see(v);
    if (std::isfinite(v) && (!axis_.logarithmic || v > 0.0))
      shaded_ = std::min(shaded_, measure(v));
  }
  AxisMap map(Ends ends, int most) const {
    if (low_ > high_)
      return AxisMap(axis_.logarithmic ? AxisRange{1.0, 10.0} : AxisRange{}, axis_.logarithmic);
    const double span = high_ - low_,
                 low = std::min(low_ - kAir * span, shaded_ - kBandShare * span);
    const AxisRange data{value(low), value(high_ + kAir * span)};
    AxisRange r = ends == Ends::as_data && span > 0.0 ? data
                  : axis_.logarithmic                 ? round_log(data)
                                                      : round_linear(data, most);
    if (axis_.low) r.low = *axis_.low;
    if (axis_.high) r.high = *axis_.high;
    return AxisMap(r, axis_.logarithmic);
  }

 private:
  static constexpr double kAir = 0.025, kBandShare = 0.06;  ///< of the data's span
  double measure(double v) const { return axis_.logarithmic ? std::log10(v) : v; }
  double value(double m) const { return axis_.logarithmic ? std::pow(10.0, m) : m; }

  const Axis& axis_;
  double low_ = std::numeric_limits<double>::infinity();
  double high_ = -std::numeric_limits<double>::infinity();
  double shaded_ = std::numeric_limits<double>::infinity();
};

}  // namespace

void AxisMap::place(double at_low, double at_high) {
  at_low_ = at_low;
  at_high_ = at_high;
}

std::vector<Tick> AxisMap::ticks(int most) const {
  return logarithmic_ ? log_ticks(range_.low, range_.high, most)
                      : linear_ticks(range_.low, range_.high, most);
}

double AxisMap::share(double v) const {
  return logarithmic_ ? std::log(v / range_.low) / std::log(range_.high / range_.low)
                      : (v - range_.low) / (range_.high - range_.low);
}

bool AxisMap::usable(double v) const { return std::isfinite(v) && (!logarithmic_ || v > 0.0); }

bool AxisMap::covers(double v) const {
  const double s = share(v);
  return s >= -kSlack && s <= 1.0 + kSlack;
}

double AxisMap::at(double v) const { return at_low_ + share(v) * (at_high_ - at_low_); }

double AxisMap::at_clamped(double v) const {
  return at_low_ + std::clamp(share(v), 0.0, 1.0) * (at_high_ - at_low_);
}

double AxisMap::at_bounded(double v) const {
  return at_low_ + std::clamp(share(v), -1.0, 2.0) * (at_high_ - at_low_);
}

AxisMap x_axis_map(const Figure& figure, int most_ticks) {
  RangeFinder finder(figure.x);
  for (const auto& s : figure.series)
    for (const auto& p : s.points)
      if (std::isfinite(p.y)) finder.see(p.x);
  for (const auto& b : figure.bands)
    for (const auto& p : b.points) finder.see(p.x);
  return finder.map(Ends::as_data, most_ticks);
}

AxisMap y_axis_map(const Figure& figure, int most_ticks) {
  RangeFinder finder(figure.y);
  for (const auto& s : figure.series)
    for (const auto& p : s.points)
      if (std::isfinite(p.x)) finder.see(p.y);
  for (const auto& b : figure.bands)
    for (const auto& p : b.points) {
      if (p.high && p.low) finder.see(*p.high), finder.see(*p.low);
      if (p.high && !p.low) finder.see_top_of_band(*p.high);
    }
  return finder.map(Ends::rounded, most_ticks);
}

}  // namespace kneeprint
