// SPDX-License-Identifier: GPL-3.0-or-later
// Diode clipper: pad -> 2.2 kohm -> two 1N914-class diodes back to back with a capacitor across ->
// make-up amplifier.
//
//   C dv/dt = (u - v)/R - 2 Is sinh(v/(n Vt)),  output = kMakeUp v,  u = kPad input
//
// The node is stiff (a conducting diode shortens RC a thousandfold), so the step is implicit: BDF2,
// second order and damping at any step (Gear, "Numerical initial value problems in ordinary
// differential equations", 1971, from memory). Each step then is the static clipper
// (w - v)/Rs = 2 Is sinh(v/(n Vt)) with 1/Rs = 1/R + 3C/(2T): its Newton solution stands in a
// table.
#pragma once

#include "unit/odd_table.h"
#include "unit/unit.h"

namespace kneeprint {

class DiodeUnit : public VirtualUnit {
 public:
  static constexpr double kPad = 1.0 / 8.0;
  static constexpr double kMakeUp = 8.0;
  static constexpr double kSeriesOhms = 2200.0;
  static constexpr double kFarads = 2.2e-9;

  explicit DiodeUnit(Hertz rate);
  void process(std::span<double> volts) override;

 private:
  double step_ohms_;   ///< Rs
  double from_input_;  ///< Rs/R kPad
  double from_past_;   ///< Rs C/(2T)
  OddTable clipped_;
  double previous_ = 0.0;
  double before_previous_ = 0.0;
};

extern const UnitRecord kDiodeUnit;

}  // namespace kneeprint
