// SPDX-License-Identifier: GPL-3.0-or-later
// Shockley's law, I = Is (exp(V / (n Vt)) - 1) (Shockley, Bell Syst. Tech. J. 28, 1949), with the
// public SPICE card of the 1N914 class: Is 2.52 nA, n 1.752, Rs 0.568 ohm. Vt = kT/q at 300.15 K
// with the exact constants of CODATA 2018. Volts, amperes, ohms.
#pragma once

namespace kneeprint {

inline constexpr double kDiodeSaturation = 2.52e-9;
inline constexpr double kDiodeSeries = 0.568;
inline constexpr double kDiodeEmission = 1.752;
inline constexpr double kThermalVolts = 1.380649e-23 * 300.15 / 1.602176634e-19;
inline constexpr double kDiodeSlopeVolts = kDiodeEmission * kThermalVolts;  ///< n Vt

/// Junction alone (Rs = 0).
double diode_current(double volts);
/// With the series resistance.
double diode_current_with_series(double volts);
/// Voltage at a current > -Is, junction alone.
double diode_voltage(double amperes);

/// Two junctions back to back across the output, fed from `source` volts through `resistance` ohms:
/// (source - v)/R = 2 Is sinh(v / (n Vt)). Solved by Newton's method.
struct ClippedVoltage {
  double volts = 0.0;
  double by_source = 0.0;  ///< dv/dsource, 0 .. 1
};
ClippedVoltage antiparallel_voltage(double source, double resistance);

}  // namespace kneeprint
