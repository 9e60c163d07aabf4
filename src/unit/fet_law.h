// SPDX-License-Identifier: GPL-3.0-or-later
// A field-effect transistor from weak to strong inversion, bulk tied to its source:
//   Id = Is (ln^2(1 + exp((Vgs - Vto)/(2 n Vt))) - ln^2(1 + exp(((Vgs - Vto)/n - Vds)/(2 Vt)))),
//   Is = 2 n beta Vt^2
// (Enz, Krummenacher & Vittoz, "An analytical MOS transistor model valid in all regions of
// operation", Analog Integr. Circuits Signal Process. 8, 1995, from memory). One smooth expression
// covers weak inversion, square law and the resistive region near the rail.
#pragma once

namespace kneeprint {

struct DrainCurrent {
  double current = 0.0;   ///< A
  double by_gate = 0.0;   ///< dId/dVgs
  double by_drain = 0.0;  ///< dId/dVds
};

/// `overdrive` = Vgs - Vto (V), `drain` = Vds (V), `beta` (A/V^2); n = 1.5, Vt as in diode_law.h.
DrainCurrent ekv_drain_current(double overdrive, double drain, double beta);

}  // namespace kneeprint
