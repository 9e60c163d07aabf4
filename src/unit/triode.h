// SPDX-License-Identifier: GPL-3.0-or-later
// 12AX7-class line stage, inverting.
//
//   input pad 150k/50k -> 22n -> grid leak 1M -> stopper 10k -> grid
//   plate: 330 V through 100k; cathode: 1.5k with 22u across
//   plate -> 100n -> 470k -> output, 43k to ground
//
// Plate law: Koren 1996; grid law: Dempwolf & Zoelzer 2011 (triode_law.h). With the three capacitor
// voltages given the rest is algebra: the grid's loop depends on one number u (open-circuit grid
// against cathode), the plate's on u and the plate supply seen through its loads. Both are solved
// exactly once and tabulated (plate current within 1e-9 A over the range of the circuit).
// The capacitors move by the explicit two-step rule of Adams and Bashforth, set back by two samples
// so that the processor can overlap samples; their time constants exceed 0.5 ms, a thousand
// samples. No interelectrode capacitance.
#pragma once

#include "unit/unit.h"

namespace kneeprint {

/// Circuit values, ohms, farads, volts.
struct TriodeCircuit {
  double pad_series = 150e3, pad_shunt = 50e3;
  double input_farads = 22e-9, grid_leak = 1e6, stopper = 10e3;
  double supply = 330.0, plate_load = 100e3;
  double cathode_ohms = 1500.0, cathode_farads = 22e-6;
  double output_farads = 100e-9, output_series = 470e3, output_shunt = 43e3;
};

/// Grid and plate currents at the voltages that the capacitors leave, exactly; for tables and
/// tests.
struct TriodeCurrents {
  double grid = 0.0, plate = 0.0;            ///< A
  double grid_by_u = 0.0, plate_by_u = 0.0;  ///< A/V
};
/// `u`: grid against cathode with the grid's wire cut; `supply`: the plate against the cathode with
/// the plate's wire cut.
TriodeCurrents triode_currents(const TriodeCircuit& circuit, double u, double supply);

class TriodeTable;

class TriodeUnit : public VirtualUnit {
 public:
  explicit TriodeUnit(Hertz rate);
  void process(std::span<double> volts) override;

  double cathode_volts() const { return cathode_; }
  double plate_volts() const;  ///< at rest, before any sample

 private:
  struct Slopes {
    double input = 0.0, cathode = 0.0, output = 0.0;  ///< volts per sample
  };
  const TriodeTable& table_;
  double period_;
  double input_ = 0.0, cathode_ = 0.0, output_ = 0.0;  ///< capacitor voltages
  Slopes past_[3];                                     ///< newest first
};

extern const UnitRecord kTriodeUnit;

}  // namespace kneeprint
