// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/triode.h"

#include <doctest/doctest.h>

#include <cmath>
#include <complex>
#include <numbers>
#include <vector>

#include "unit/harmonics.h"
#include "unit/triode_law.h"
#include "unit/triode_table.h"

using kneeprint::Hertz;
using kneeprint::triode_currents;
using kneeprint::TriodeCircuit;
using kneeprint::TriodeTable;
using kneeprint::TriodeUnit;

namespace {

constexpr double kRate = 48000.0 * 32;

double parallel(double a, double b) { return a * b / (a + b); }

// The circuit's equations written out, with the exact laws, by the classical Runge-Kutta method.
class SlowTriode {
 public:
  SlowTriode(double input, double cathode, double output) : state_{input, cathode, output} {}

  // One step of `h` with the input going from `a` over `middle` to `b`.
  void step(double h, double a, double middle, double b) {
    double k[4][3], at[3];
    const double drive[] = {a, middle, middle, b};
    const double part[] = {0.0, 0.5, 0.5, 1.0};
    for (int s = 0; s < 4; ++s) {
      for (int i = 0; i < 3; ++i) at[i] = state_[i] + (s ? part[s] * h * k[s - 1][i] : 0.0);
      slopes(drive[s], at, k[s]);
    }
    for (int i = 0; i < 3; ++i) {
      state_[i] += h / 6.0 * (k[0][i] + 2.0 * k[1][i] + 2.0 * k[2][i] + k[3][i]);
    }
  }
  double output(double in) const {
    double unused[3];
    return slopes(in, state_, unused);
  }

 private:
  double slopes(double in, const double* s, double* slope) const {
    const double source = parallel(c_.pad_series, c_.pad_shunt);
    const double open = in * c_.pad_shunt / (c_.pad_series + c_.pad_shunt) - s[0];
    const double load = c_.output_series + c_.output_shunt;
    const double share = c_.grid_leak / (source + c_.grid_leak);
    const double plate_open =
        (c_.supply / c_.plate_load + s[2] / load) * parallel(c_.plate_load, load);
    const auto i = triode_currents(c_, open * share - s[1], plate_open - s[1]);
    const double node = share * open - parallel(source, c_.grid_leak) * i.grid;
    const double output_current =
        (plate_open - parallel(c_.plate_load, load) * i.plate - s[2]) / load;
    slope[0] = (open - node) / source / c_.input_farads;
    slope[1] = (i.plate + i.grid - s[1] / c_.cathode_ohms) / c_.cathode_farads;
    slope[2] = output_current / c_.output_farads;
    return output_current * c_.output_shunt;
  }
  TriodeCircuit c_;
  double state_[3];
};

}  // namespace

TEST_CASE("the stage rests at the published operating point") {
  // Reference values 13.1: 330 V, 100 kohm, 1.5 kohm: 1.07419055350 mA, Vg -1.61128583025 V, plate
  // to cathode 220.96965882 V. The coupled load draws no direct current.
  const TriodeUnit unit{Hertz(kRate)};
  CHECK(std::fabs(unit.cathode_volts() - 1.61128583025) < 1e-6);  // table: 1e-9 A times 1.5 kohm
  CHECK(std::fabs(unit.plate_volts() - unit.cathode_volts() - 220.96965882) < 1e-4);
}

TEST_CASE("rest stays at rest") {
  TriodeUnit unit{Hertz(kRate)};
  std::vector<double> silence(100000, 0.0);
  unit.process(silence);
  double worst = 0.0;
  for (const double v : silence) worst = std::fmax(worst, std::fabs(v));
  CHECK(worst < 1e-12);
}

TEST_CASE("tabulated currents are the laws' within the stated error") {
  const TriodeTable table{TriodeCircuit{}};
  double worst_plate = 0.0, worst_grid = 0.0;
  for (double u = -13.9; u < 9.0; u += 0.0973) {
    for (double supply = 296.2; supply <= 326.0; supply += 3.17) {
      const auto exact = triode_currents({}, u, supply);
      const auto read = table.at(u, supply);
      worst_plate = std::fmax(worst_plate, std::fabs(read.plate - exact.plate));
      worst_grid = std::fmax(worst_grid, std::fabs(read.grid - exact.grid));
    }
  }
  CHECK(worst_plate < 1e-9);
  CHECK(worst_grid < 1e-9);
}

TEST_CASE("small-signal gain is that of the linearised circuit") {
  // The usual mesh of a stage with mu, rp and complex impedances, at the rest point.
  const TriodeCircuit c;
  TriodeUnit unit{Hertz(kRate)};
  const auto law = kneeprint::koren_plate_current(unit.plate_volts() - unit.cathode_volts(),
                                                  -unit.cathode_volts());
  const std::size_t period = 37463;  // 41 Hz
  const double w = 2.0 * std::numbers::pi * kRate / static_cast<double>(period);
  const std::complex<double> j(0.0, 1.0);
  const auto both = [](std::complex<double> a, std::complex<double> b) { return a * b / (a + b); };
  const auto cathode = both(c.cathode_ohms, 1.0 / (j * w * c.cathode_farads));
  const auto branch = c.output_series + c.output_shunt + 1.0 / (j * w * c.output_farads);
  const auto plate = both(c.plate_load, branch);
  const double source = parallel(c.pad_series, c.pad_shunt);
  const auto grid = c.pad_shunt / (c.pad_series + c.pad_shunt) * c.grid_leak /
                    (c.grid_leak + source + 1.0 / (j * w * c.input_farads));
  const auto current =
      law.by_grid * grid / (1.0 + (law.by_grid + law.by_plate) * cathode + law.by_plate * plate);
  const auto expected = -current * plate * c.output_shunt / branch;

  std::vector<double> x(period);
  for (int cycle = 0; cycle < 40; ++cycle) {  // 1 s: sixteen of the longest time constant
    for (std::size_t n = 0; n < period; ++n) {
      x[n] = 1e-3 * std::cos(2.0 * std::numbers::pi * static_cast<double>(n) /
                             static_cast<double>(period));
    }
    unit.process(x);
  }
  // 1 mV bends by under 1e-6; the table's slopes and the explicit steps by less than 1e-5.
  CHECK(std::abs(line(x, 1) / 1e-3 - expected) < 2e-5);
}

// Largest difference over 2.6 ms of hot 997 Hz from rest; the grid conducts twice.
double worst_difference(double rate) {
  TriodeUnit unit{Hertz(rate)};
  SlowTriode slow(0.0, unit.cathode_volts(), unit.plate_volts());
  const double w = 2.0 * std::numbers::pi * 997.0 / rate;
  double worst = 0.0;
  for (int n = 0; n < 2.6e-3 * rate; ++n) {
    const double v = 15.0 * std::sin(w * n);
    double out = v;
    unit.process({&out, 1});
    worst = std::fmax(worst, std::fabs(out - slow.output(v)));
    slow.step(1.0 / rate, v, 15.0 * std::sin(w * (n + 0.5)), 15.0 * std::sin(w * (n + 1)));
  }
  return worst;
}

TEST_CASE("hot drive from rest follows the circuit's equations, to second order") {
  // The capacitors' slopes are carried on over 2.5 samples: wrong by the square of the sample. 1e-4
  // V is 1e-5 of the peak; at four times the rate 16 times less, but for the table's few
  // microvolts.
  const double at_rate = worst_difference(kRate);
  CHECK(at_rate < 1e-4);
  CHECK(worst_difference(4.0 * kRate) < at_rate / 8.0);
}

TEST_CASE("gain about unity to +6 dB, inverting, and under +20 dBu at the hottest") {
  TriodeUnit unit{Hertz(kRate)};
  const std::size_t period = 1536;  // 1 kHz
  std::vector<double> x(period);
  const auto drive = [&](double peak, int cycles) {
    for (int cycle = 0; cycle < cycles; ++cycle) {
      for (std::size_t n = 0; n < period; ++n) {
        x[n] = peak * std::cos(2.0 * std::numbers::pi * static_cast<double>(n) /
                               static_cast<double>(period));
      }
      unit.process(x);
    }
    return line(x, 1);
  };
  const double gain = drive(0.01, 100).real() / 0.01;
  CHECK(gain < -1.0);
  CHECK(gain > -2.0);
  drive(17.36, 500);
  double peak = 0.0;
  for (const double v : x) peak = std::fmax(peak, std::fabs(v));
  CHECK(peak < 12.0);
  CHECK(peak > 8.0);
}
