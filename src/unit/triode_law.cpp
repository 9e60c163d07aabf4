// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/triode_law.h"

#include <boost/math/tools/roots.hpp>
#include <cmath>
#include <limits>
#include <utility>

namespace kneeprint {
namespace {

constexpr double kMu = 100.0;
constexpr double kExponent = 1.4;
constexpr double kG1 = 1060.0;
constexpr double kP = 600.0;
constexpr double kVb = 300.0;

constexpr double kGridConductance = 6.177e-4;
constexpr double kGridSharpness = 9.901;
constexpr double kGridExponent = 1.314;

// ln(1 + e^z) and its derivative.
struct SoftRamp {
  double value, slope;
};
SoftRamp soft_ramp(double z) {
  const double e = std::exp(-std::fabs(z));
  return {(z > 0.0 ? z : 0.0) + std::log1p(e), (z > 0.0 ? 1.0 : e) / (1.0 + e)};
}

}  // namespace

PlateCurrent koren_plate_current(double plate, double grid) {
  if (plate <= 0.0) return {};
  const double root = std::sqrt(kVb + plate * plate);
  const SoftRamp ramp = soft_ramp(kP * (1.0 / kMu + grid / root));
  const double e1 = plate / kP * ramp.value;
  if (e1 <= 0.0) return {};
  const double e1_by_grid = plate * ramp.slope / root;
  const double e1_by_plate =
      ramp.value / kP - plate * plate * ramp.slope * grid / (root * root * root);
  const double current = 2.0 * std::pow(e1, kExponent) / kG1;
  const double by_e1 = kExponent * current / e1;
  return {current, by_e1 * e1_by_grid, by_e1 * e1_by_plate};
}

PlateCurrent load_line_current(double supply, double load, double grid) {
  if (supply <= 0.0) return {};
  // Solved for the plate voltage: supply - load Ip(Vp) - Vp falls steadily from Vp = 0 to supply.
  std::uintmax_t steps = 100;
  const double plate = boost::math::tools::newton_raphson_iterate(
      [&](double v) {
        const PlateCurrent ip = koren_plate_current(v, grid);
        return std::pair(v - supply + load * ip.current, 1.0 + load * ip.by_plate);
      },
      0.7 * supply, 0.0, supply, std::numeric_limits<double>::digits, steps);
  const PlateCurrent ip = koren_plate_current(plate, grid);
  const double feedback = 1.0 + load * ip.by_plate;
  return {ip.current, ip.by_grid / feedback, ip.by_plate / feedback};
}

GridCurrent grid_current(double grid) {
  const SoftRamp ramp = soft_ramp(kGridSharpness * grid);
  const double effective = ramp.value / kGridSharpness;
  if (effective <= 0.0) return {};
  const double current = kGridConductance * std::pow(effective, kGridExponent);
  return {current, kGridExponent * current / effective * ramp.slope};
}

}  // namespace kneeprint
