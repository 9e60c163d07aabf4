// SPDX-License-Identifier: GPL-3.0-or-later
// Static laws of a 12AX7-class triode. Volts against the cathode, amperes.
#pragma once

namespace kneeprint {

/// Plate current and its partial derivatives.
struct PlateCurrent {
  double current = 0.0;   ///< A
  double by_grid = 0.0;   ///< dIp/dVg, A/V (gm)
  double by_plate = 0.0;  ///< dIp/dVp, A/V (1/rp)
};

/// Koren, "Improved vacuum-tube models for SPICE simulations", Glass Audio 8(5), 1996:
///   E1 = (Vp/kp) ln(1 + exp(kp (1/mu + Vg/sqrt(kvb + Vp^2)))),  Ip = 2 E1^ex / kg1, 0 for Vp <= 0
/// 12AX7: mu 100, ex 1.4, kg1 1060, kp 600, kvb 300 V^2.
PlateCurrent koren_plate_current(double plate, double grid);

/// The current where `supply` feeds the plate through `load` ohms (> 0): Vp = supply - load Ip.
/// by_grid is dIp/dVg along the load line, by_plate is dIp/dsupply.
PlateCurrent load_line_current(double supply, double load, double grid);

/// Dempwolf & Zoelzer, "A physically-motivated triode model for circuit simulations", DAFx-11,
/// 2011:
///   Ig = Gg (ln(1 + exp(Cg Vg)) / Cg)^xi,  Gg 6.177e-4, Cg 9.901, xi 1.314 (from memory);
/// their constant leakage is left out.
struct GridCurrent {
  double current = 0.0;
  double by_grid = 0.0;
};
GridCurrent grid_current(double grid);

}  // namespace kneeprint
