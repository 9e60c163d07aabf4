// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/triode.h"

#include <algorithm>
#include <boost/math/tools/roots.hpp>
#include <cmath>
#include <limits>
#include <utility>

#include "unit/settings.h"
#include "unit/triode_law.h"
#include "unit/triode_table.h"

namespace kneeprint {
namespace {

constexpr TriodeCircuit kCircuit;

constexpr double parallel(double a, double b) { return a * b / (a + b); }

// What the linear parts of the circuit amount to at the tube's electrodes.
struct Thevenin {
  double pad_gain, source;     // source behind the coupling capacitor
  double grid_share, grid;     // with the grid leak; `grid` adds the stopper
  double leak_side;            // source and leak in parallel
  double output_load;          // behind the output capacitor
  double plate, supply_share;  // plate load with the output's
};
constexpr Thevenin thevenin(const TriodeCircuit& c) {
  Thevenin t{};
  t.pad_gain = c.pad_shunt / (c.pad_series + c.pad_shunt);
  t.source = parallel(c.pad_series, c.pad_shunt);
  t.grid_share = c.grid_leak / (t.source + c.grid_leak);
  t.leak_side = parallel(t.source, c.grid_leak);
  t.grid = t.leak_side + c.stopper;
  t.output_load = c.output_series + c.output_shunt;
  t.plate = parallel(c.plate_load, t.output_load);
  t.supply_share = t.output_load / (c.plate_load + t.output_load);
  return t;
}
constexpr Thevenin kThevenin = thevenin(kCircuit);

const TriodeTable& shared_table() {
  static const TriodeTable table(kCircuit);
  return table;
}

std::unique_ptr<VirtualUnit> make_triode(const UnitSettings& settings, Hertz rate) {
  SettingsReader("triode", settings).finish();
  return std::make_unique<TriodeUnit>(rate);
}

}  // namespace

TriodeCurrents triode_currents(const TriodeCircuit& circuit, double u, double supply) {
  const Thevenin t = thevenin(circuit);
  // Grid loop: v + R Ig(v) = u rises steadily in v, and v = lowest gives less than u.
  const double lowest = std::min(u, 0.0) - t.grid * grid_current(0.0).current;
  std::uintmax_t steps = 100;
  const double v = boost::math::tools::newton_raphson_iterate(
      [&](double x) {
        const GridCurrent ig = grid_current(x);
        return std::pair(x + t.grid * ig.current - u, 1.0 + t.grid * ig.by_grid);
      },
      std::min(u, 0.2), lowest, u, std::numeric_limits<double>::digits, steps);
  const GridCurrent ig = grid_current(v);
  const double v_by_u = 1.0 / (1.0 + t.grid * ig.by_grid);
  const PlateCurrent ip = load_line_current(supply, t.plate, v);
  return {ig.current, ip.current, ig.by_grid * v_by_u, ip.by_grid * v_by_u};
}

TriodeUnit::TriodeUnit(Hertz rate) : table_(shared_table()), period_(1.0 / rate.value()) {
  // Rest: no current through the capacitors. The table's own rest is sought, so that nothing
  // drifts.
  const auto at_rest = [this](double cathode) {
    input_ = 0.0;
    cathode_ = cathode;
    TriodeTable::Currents i{};
    for (int step = 0; step < 40;
         ++step) {  // contracts 20-fold per step: plate load feeds the output
      output_ = kCircuit.supply - kCircuit.plate_load * i.plate;
      const double supply = kThevenin.supply_share * kCircuit.supply +
                            (1.0 - kThevenin.supply_share) * output_ - cathode_;
      input_ = kCircuit.grid_leak * i.grid;
      i = table_.at(-kThevenin.grid_share * input_ - cathode_, supply);
    }
    return kCircuit.cathode_ohms * (i.plate + i.grid) - cathode;
  };
  const auto bracket = boost::math::tools::bisect(
      at_rest, 0.5, 4.0, [](double a, double b) { return std::fabs(b - a) < 1e-14; });
  at_rest(0.5 * (bracket.first + bracket.second));
}

double TriodeUnit::plate_volts() const { return output_; }

void TriodeUnit::process(std::span<double> volts) {
  constexpr TriodeCircuit c = kCircuit;
  constexpr Thevenin t = kThevenin;
  const double input_step = period_ / c.input_farads;
  const double cathode_step = period_ / c.cathode_farads;
  const double output_step = period_ / c.output_farads;
  const TriodeTable& table = table_;
  double input = input_, cathode = cathode_, output = output_;
  Slopes newest = past_[0], middle = past_[1], oldest = past_[2];
  for (double& v : volts) {
    const double source = t.pad_gain * v - input;
    const double supply = t.supply_share * c.supply + (1.0 - t.supply_share) * output - cathode;
    const TriodeTable::Currents i = table.at(t.grid_share * source - cathode, supply);
    const double leak_node = t.grid_share * source - t.leak_side * i.grid;
    const double plate = supply + cathode - t.plate * i.plate;
    const double output_current = (plate - output) * (1.0 / (c.output_series + c.output_shunt));
    v = c.output_shunt * output_current;

    // Slopes at the last two samples but one, carried on to the middle of the step.
    input += 3.5 * middle.input - 2.5 * oldest.input;
    cathode += 3.5 * middle.cathode - 2.5 * oldest.cathode;
    output += 3.5 * middle.output - 2.5 * oldest.output;
    oldest = middle;
    middle = newest;
    newest.input = input_step * (1.0 / t.source) * (source - leak_node);
    newest.cathode = cathode_step * (i.plate + i.grid - cathode * (1.0 / c.cathode_ohms));
    newest.output = output_step * output_current;
  }
  input_ = input;
  cathode_ = cathode;
  output_ = output;
  past_[0] = newest;
  past_[1] = middle;
  past_[2] = oldest;
}

constinit const UnitRecord kTriodeUnit{
    "triode",
    "triode line stage (invented), inverting",
    "12AX7-class stage: Koren's plate law (1996), grid current by Dempwolf & Zoelzer (2011), "
    "coupling "
    "capacitors, bypassed cathode resistor; see src/unit/triode.h.",
    32,
    "",
    make_triode};

}  // namespace kneeprint
