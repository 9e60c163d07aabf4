// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/fet_law.h"

#include <cmath>

#include "unit/diode_law.h"

namespace kneeprint {
namespace {

constexpr double kSlopeFactor = 1.5;

// ln^2(1 + exp(v/2)) and its derivative by v.
struct Inversion {
  double value, slope;
};
Inversion inversion(double v) {
  const double z = 0.5 * v;
  const double e = std::exp(-std::fabs(z));
  const double ramp = (z > 0.0 ? z : 0.0) + std::log1p(e);
  return {ramp * ramp, ramp * (z > 0.0 ? 1.0 : e) / (1.0 + e)};
}

}  // namespace

DrainCurrent ekv_drain_current(double overdrive, double drain, double beta) {
  const double pinch_off = overdrive / kSlopeFactor;
  const Inversion forward = inversion(pinch_off / kThermalVolts);
  const Inversion reverse = inversion((pinch_off - drain) / kThermalVolts);
  const double scale = 2.0 * kSlopeFactor * beta * kThermalVolts * kThermalVolts;
  return {scale * (forward.value - reverse.value),
          scale * (forward.slope - reverse.slope) / (kSlopeFactor * kThermalVolts),
          scale * reverse.slope / kThermalVolts};
}

}  // namespace kneeprint
