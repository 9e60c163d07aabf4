// SPDX-License-Identifier: GPL-3.0-or-later
// The triode stage's grid and plate currents from a table: cubic Hermite in u, a polynomial of
// fourth degree through Chebyshev points in the plate supply.
#pragma once

#include <vector>

#include "unit/triode.h"

namespace kneeprint {

class TriodeTable {
 public:
  /// Volts; beyond them the nearest end holds. They enclose what inputs of +-20 V can bring about.
  static constexpr double kLowestU = -14.0, kHighestU = 9.0;
  static constexpr double kLowestSupply = 296.0, kHighestSupply = 326.0;

  explicit TriodeTable(const TriodeCircuit& circuit);

  struct Currents {
    double grid, plate;  ///< A
  };
  Currents at(double u, double supply) const {
    double position = (u - kLowestU) * kCellsPerVolt;
    position = position > 0.0 ? position : 0.0;
    position = position < kLastPosition ? position : kLastPosition;
    const int index = static_cast<int>(position);
    const double t = position - index;
    const Cell& cell = cells_[static_cast<std::size_t>(index)];
    double e = (supply - kMidSupply) * (1.0 / kHalfSupply);
    e = e > -1.0 ? e : -1.0;
    e = e < 1.0 ? e : 1.0;
    double c[4];
    for (int j = 0; j < 4; ++j) {
      const double* p = cell.plate[0] + j;
      c[j] = (((p[16] * e + p[12]) * e + p[8]) * e + p[4]) * e + p[0];
    }
    const double* g = cell.grid;
    return {((g[3] * t + g[2]) * t + g[1]) * t + g[0], ((c[3] * t + c[2]) * t + c[1]) * t + c[0]};
  }

 private:
  static constexpr int kDegree = 4;
  static constexpr double kCellsPerVolt = 96.0;
  static constexpr double kLastPosition = (kHighestU - kLowestU) * kCellsPerVolt - 1e-9;
  static constexpr double kMidSupply = 0.5 * (kLowestSupply + kHighestSupply);
  static constexpr double kHalfSupply = 0.5 * (kHighestSupply - kLowestSupply);

  struct Cell {
    double grid[4];                ///< of t = 0 .. 1
    double plate[kDegree + 1][4];  ///< of e = -1 .. 1, then t
  };
  std::vector<Cell> cells_;
};

}  // namespace kneeprint
