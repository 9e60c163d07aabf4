// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/diode.h"

#include "unit/diode_law.h"
#include "unit/settings.h"

namespace kneeprint {
namespace {

// Inputs of +-20 V reach 2.5 V after the pad, and the capacitor adds less than a diode's voltage.
constexpr double kTableRange = 5.0;

OddTable clipper_table(double resistance) {
  // Cells of 0.24 mV at the origin and 1 mV at the knee, against n Vt = 45 mV: error under 1e-11 V.
  return OddTable(
      [resistance](double w) {
        const ClippedVoltage v = antiparallel_voltage(w, resistance);
        return OddTable::Sample{v.volts, v.by_source};
      },
      kTableRange, 0.125, 9);
}

std::unique_ptr<VirtualUnit> make_diode(const UnitSettings& settings, Hertz rate) {
  SettingsReader("diode", settings).finish();
  return std::make_unique<DiodeUnit>(rate);
}

}  // namespace

DiodeUnit::DiodeUnit(Hertz rate)
    : step_ohms_(1.0 / (1.0 / kSeriesOhms + 1.5 * kFarads * rate.value())),
      from_input_(step_ohms_ / kSeriesOhms * kPad),
      from_past_(step_ohms_ * 0.5 * kFarads * rate.value()),
      clipped_(clipper_table(step_ohms_)) {}

void DiodeUnit::process(std::span<double> volts) {
  for (double& v : volts) {
    const double w = from_input_ * v + from_past_ * (4.0 * previous_ - before_previous_);
    before_previous_ = previous_;
    previous_ = clipped_(w);
    v = kMakeUp * previous_;
  }
}

constinit const UnitRecord kDiodeUnit{"diode",
                                      "diode clipper (invented)",
                                      "Pad 1:8, 2.2 kohm, two 1N914-class diodes back to back "
                                      "(Shockley's law, public SPICE card) with "
                                      "2.2 nF across, make-up of 8; solved implicitly (BDF2).",
                                      32,
                                      "",
                                      make_diode};

}  // namespace kneeprint
