// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/diode_law.h"

#include <doctest/doctest.h>

#include <cmath>

#include "unit/harmonics.h"

using kneeprint::antiparallel_voltage;
using kneeprint::diode_current;
using kneeprint::diode_current_with_series;
using kneeprint::diode_voltage;
using kneeprint::kDiodeSaturation;
using kneeprint::kDiodeSlopeVolts;
using kneeprint::kThermalVolts;

TEST_CASE("Shockley's law gives the reference currents and voltages") {
  // Reference values 13.2: card Is 2.52 nA, n 1.752, Rs 0.568 ohm, 300.15 K.
  CHECK(std::fabs(kThermalVolts - 0.025864925786) < 1e-12);
  CHECK(std::fabs(kDiodeSlopeVolts - 0.045315349978) < 1e-12);
  struct Row {
    double volts, junction, with_series;
  };
  for (const Row& row :
       {Row{0.2, 2.055291630e-7, 2.055286270e-7}, Row{0.4, 1.717385072e-5, 1.717015447e-5},
        Row{0.5, 1.560655720e-4, 1.557611666e-4}, Row{0.6, 1.418064762e-3, 1.393510731e-3},
        Row{0.7, 1.288485300e-2, 1.119757955e-2}}) {
    CAPTURE(row.volts);
    CHECK(diode_current(row.volts) ==
          doctest::Approx(row.junction).epsilon(1e-9));  // digits printed
    CHECK(diode_current_with_series(row.volts) == doctest::Approx(row.with_series).epsilon(1e-9));
  }
  const double volts[] = {0.271258283, 0.375498100, 0.479830273, 0.584171695, 0.688514041};
  for (int i = 0; i < 5; ++i) {
    CHECK(std::fabs(diode_voltage(1e-6 * std::pow(10.0, i)) - volts[i]) < 1e-9);
  }
  CHECK(diode_current(-1.0) == doctest::Approx(-kDiodeSaturation).epsilon(1e-8));
  CHECK(diode_current_with_series(-1.0) == doctest::Approx(-kDiodeSaturation).epsilon(1e-8));
}

TEST_CASE("antiparallel clipper: reference voltages and harmonics") {
  // Reference values 13.2: 2.2 kohm, Rs = 0.
  const double in[] = {0.1, 0.2, 0.5, 1, 2, 5, 10};
  const double out[] = {0.099950292110, 0.199546913273, 0.428743351234, 0.515596147944,
                        0.564814527372, 0.615422671293, 0.649740478333};
  for (int i = 0; i < 7; ++i) {
    CHECK(std::fabs(antiparallel_voltage(in[i], 2200).volts - out[i]) < 1e-11);
    CHECK(antiparallel_voltage(-in[i], 2200).volts == -antiparallel_voltage(in[i], 2200).volts);
    const double h = 1e-6;
    const double slope = (antiparallel_voltage(in[i] + h, 2200).volts -
                          antiparallel_voltage(in[i] - h, 2200).volts) /
                         (2 * h);
    CHECK(antiparallel_voltage(in[i], 2200).by_source == doctest::Approx(slope).epsilon(1e-6));
  }
  CHECK(antiparallel_voltage(0.0, 2200).volts == 0.0);

  const auto clip = [](double v) { return antiparallel_voltage(v, 2200).volts; };
  const double amplitude[] = {0.5, 1.0, 2.0};
  const double expected[3][6] = {
      {0.4553878297, -0.0232961023, -0.0045875685, 0.0009692509, 0.0004181782, -0.0001219090},
      {0.6031936131, -0.1104861253, 0.0264343443, -0.0017517263, -0.0039811757, 0.0034191634},
      {0.6865531483, -0.1741490066, 0.0786310714, -0.0395238845, 0.0195605835, -0.0085881827}};
  for (int i = 0; i < 3; ++i) {
    for (std::size_t k = 0; k < 6; ++k) {
      CAPTURE(k);
      CHECK(std::fabs(harmonic(clip, 0.0, amplitude[i], 2 * k + 1) - expected[i][k]) < 1e-9);
    }
  }
}
