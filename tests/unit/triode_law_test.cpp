// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/triode_law.h"

#include <doctest/doctest.h>

#include <cmath>
#include <initializer_list>

#include "unit/harmonics.h"

using kneeprint::grid_current;
using kneeprint::koren_plate_current;
using kneeprint::load_line_current;

TEST_CASE("Koren's 12AX7 law gives the reference currents and slopes") {
  // Reference values 13.1: evaluated with 20 and more digits, derivatives by mpmath.
  struct Row {
    double plate, grid, milliampere, millisiemens, kiloohm;
  };
  for (const Row& row :
       {Row{250, -2, 0.951803210, 1.669980, 53.6880}, Row{100, -1, 0.100391369, 0.587610, 140.6384},
        Row{200, -1, 1.939164618, 2.527871, 38.2857}, Row{250, 0, 6.809119644, 3.793017, 26.2253},
        Row{100, 0, 1.887882467, 2.596749, 37.8353}, Row{300, -3, 0.432322557, 0.869815, 93.5737},
        Row{150, -1.5, 0.168767760, 0.671287, 121.9556},
        Row{221, -1.61, 1.077225708, 1.879928, 48.9336},
        Row{300, -4, 0.040443999, 0.106091, 625.5510}}) {
    CAPTURE(row.plate);
    CAPTURE(row.grid);
    const auto ip = koren_plate_current(row.plate, row.grid);
    CHECK(std::fabs(ip.current * 1e3 - row.milliampere) < 1e-9);   // stated tolerance
    CHECK(std::fabs(ip.by_grid * 1e3 - row.millisiemens) < 1e-6);  // digits printed
    CHECK(std::fabs(1e-3 / ip.by_plate - row.kiloohm) < 1e-4);
  }
  CHECK(koren_plate_current(0.0, 0.0).current == 0.0);
  CHECK(koren_plate_current(-5.0, 1.0).current == 0.0);
  CHECK(koren_plate_current(300.0, -50.0).current < 1e-12);
}

TEST_CASE("static load-line stage has the reference harmonics") {
  // Reference values 13.1: 300 V, 100 kohm, grounded cathode, Vg = -1.5 + A cos, plate volts.
  const auto plate = [](double grid) {
    return 300.0 - 100e3 * load_line_current(300.0, 100e3, grid).current;
  };
  CHECK(std::fabs(plate(-1.5) - 204.6948441856) < 1e-8);
  const double half[] = {203.8945037691, -30.3454075334, -0.8007848288,
                         0.0382461485,   -0.0004430886,  0.0000868291};
  const double one[] = {201.4781652399, -59.9852496800, -3.2233881239,
                        0.3156634422,   -0.0065894065,  0.0024836091};
  for (std::size_t n = 0; n < 6; ++n) {
    CAPTURE(n);
    CHECK(std::fabs(harmonic(plate, -1.5, 0.5, n, 256) - half[n]) < 1e-8);  // stated tolerance
    CHECK(std::fabs(harmonic(plate, -1.5, 1.0, n, 256) - one[n]) < 1e-8);
  }
}

TEST_CASE("derivatives agree with differences") {
  constexpr double h = 1e-5;  // differences then carry about 1e-9 of the value
  for (const double v : {-2.0, -0.5, 0.0, 0.3, 1.0}) {
    CAPTURE(v);
    const double by_grid = (load_line_current(310.0, 83e3, v + h).current -
                            load_line_current(310.0, 83e3, v - h).current) /
                           (2 * h);
    CHECK(load_line_current(310.0, 83e3, v).by_grid == doctest::Approx(by_grid).epsilon(1e-6));
    const double by_supply = (load_line_current(310.0 + h, 83e3, v).current -
                              load_line_current(310.0 - h, 83e3, v).current) /
                             (2 * h);
    CHECK(load_line_current(310.0, 83e3, v).by_plate == doctest::Approx(by_supply).epsilon(1e-5));
    const double grid = (grid_current(v + h).current - grid_current(v - h).current) / (2 * h);
    CHECK(grid_current(v).by_grid == doctest::Approx(grid).epsilon(1e-6));
  }
}

TEST_CASE("grid current: power law when conducting, gone when negative") {
  // Far above 0 V the soft ramp is V itself: Ig = Gg V^xi (Dempwolf & Zoelzer 2011).
  CHECK(grid_current(4.0).current ==
        doctest::Approx(6.177e-4 * std::pow(4.0, 1.314)).epsilon(1e-9));
  CHECK(grid_current(-1.6).current < 1e-12);
  CHECK(grid_current(-200.0).current == 0.0);
}
