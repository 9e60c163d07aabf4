// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/odd_table.h"

#include <doctest/doctest.h>

#include <cmath>

using kneeprint::OddTable;

TEST_CASE("a table reads a smooth odd function within the bound of its cells") {
  const auto sine = [](double x) { return OddTable::Sample{std::sin(x), std::cos(x)}; };
  const OddTable table(sine, 3.0, 1.0, 6);
  CHECK(table.limit() == 3.0);  // 1 -> 2 -> 4, less the origin
  double worst = 0.0;
  for (double x = -3.0; x <= 3.0; x += 0.00137)
    worst = std::fmax(worst, std::fabs(table(x) - std::sin(x)));
  // |f''''| <= 1, widest cell 2/64: (1/32)^4 / 384 = 2.5e-9.
  CHECK(worst < 2.5e-9);
  CHECK(worst > 1e-10);  // the bound is of the right size: the check can see an error
  CHECK(table(0.0) == 0.0);
  CHECK(table(-1.1) == -table(1.1));
  CHECK(table(3.0) == std::sin(3.0));
  CHECK(table(1e9) == std::sin(3.0));
  CHECK(table(-1e9) == -std::sin(3.0));
}

TEST_CASE("a cubic is exact") {
  const OddTable table(
      [](double x) {
        return OddTable::Sample{x * x * x, 3 * x * x};
      },
      7.0, 0.125, 3);
  for (double x = -7.0; x <= 7.0; x += 0.0731) CHECK(std::fabs(table(x) - x * x * x) < 1e-12);
}
