// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/diode_law.h"

#include <algorithm>
#include <boost/math/tools/roots.hpp>
#include <cmath>
#include <limits>
#include <utility>

namespace kneeprint {
namespace {

constexpr int kDigits = std::numeric_limits<double>::digits;

}  // namespace

double diode_current(double volts) {
  return kDiodeSaturation * std::expm1(volts / kDiodeSlopeVolts);
}

double diode_current_with_series(double volts) {
  if (volts <= 0.0) {
    // Reverse: the drop is under Rs Is = 1.4 nV, one step of fixed-point iteration is exact to
    // 1e-15.
    return diode_current(volts - kDiodeSeries * diode_current(volts));
  }
  std::uintmax_t steps = 100;
  const double highest = std::min(diode_current(std::min(volts, 20.0)), volts / kDiodeSeries);
  const double junction = boost::math::tools::newton_raphson_iterate(
      [&](double v) {
        const double i = diode_current(v);
        return std::pair(v + kDiodeSeries * i - volts,
                         1.0 + kDiodeSeries * (i + kDiodeSaturation) / kDiodeSlopeVolts);
      },
      std::min(volts, diode_voltage(highest)), 0.0, volts, kDigits, steps);
  return diode_current(junction);
}

double diode_voltage(double amperes) {
  return kDiodeSlopeVolts * std::log1p(amperes / kDiodeSaturation);
}

ClippedVoltage antiparallel_voltage(double source, double resistance) {
  const double magnitude = std::fabs(source);
  // v <= source and 2 Is sinh(v/nVt) <= source/R bound the root; from that bound Newton's steps on
  // this convex function come down without overshoot.
  const double ceiling = std::min(
      magnitude, kDiodeSlopeVolts * std::asinh(magnitude / (2.0 * kDiodeSaturation * resistance)));
  const auto slope = [&](double v) {
    return 1.0 +
           resistance * 2.0 * kDiodeSaturation / kDiodeSlopeVolts * std::cosh(v / kDiodeSlopeVolts);
  };
  std::uintmax_t steps = 100;
  const double v =
      magnitude == 0.0
          ? 0.0
          : boost::math::tools::newton_raphson_iterate(
                [&](double x) {
                  const double pair_current =
                      2.0 * kDiodeSaturation * std::sinh(x / kDiodeSlopeVolts);
                  return std::pair(x + resistance * pair_current - magnitude, slope(x));
                },
                ceiling, 0.0, magnitude, kDigits, steps);
  return {std::copysign(v, source), 1.0 / slope(v)};
}

}  // namespace kneeprint
