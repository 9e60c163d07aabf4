// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/triode_table.h"

#include <array>
#include <cmath>
#include <numbers>

namespace kneeprint {
namespace {

constexpr std::size_t kNodes = 5;
using Nodes = std::array<double, kNodes>;

// Coefficients of 1, x, x^2, ... of the polynomial through (at[i], value[i]): Newton's divided
// differences, then expanded.
Nodes polynomial_through(const Nodes& at, Nodes value) {
  for (std::size_t order = 1; order < kNodes; ++order) {
    for (std::size_t i = kNodes - 1; i >= order; --i) {
      value[i] = (value[i] - value[i - 1]) / (at[i] - at[i - order]);
    }
  }
  Nodes coefficients{};
  for (std::size_t i = kNodes; i-- > 0;) {
    for (std::size_t k = kNodes - 1; k > 0; --k) {
      coefficients[k] = coefficients[k - 1] - at[i] * coefficients[k];
    }
    coefficients[0] = value[i] - at[i] * coefficients[0];
  }
  return coefficients;
}

std::array<double, 4> hermite(double left, double left_slope, double right, double right_slope) {
  const double rise = right - left;
  return {left, left_slope, 3.0 * rise - 2.0 * left_slope - right_slope,
          left_slope + right_slope - 2.0 * rise};
}

}  // namespace

TriodeTable::TriodeTable(const TriodeCircuit& circuit) {
  static_assert(kDegree + 1 == kNodes);
  Nodes supplies;
  for (std::size_t i = 0; i < kNodes; ++i) {
    supplies[i] = std::cos(std::numbers::pi * (static_cast<double>(i) + 0.5) / kNodes);
  }
  using Column = std::array<TriodeCurrents, kNodes>;
  const auto column_at = [&](double u) {
    Column column;
    for (std::size_t i = 0; i < kNodes; ++i) {
      column[i] = triode_currents(circuit, u, kMidSupply + kHalfSupply * supplies[i]);
    }
    return column;
  };

  const auto count = static_cast<int>((kHighestU - kLowestU) * kCellsPerVolt);
  constexpr double kWidth = 1.0 / kCellsPerVolt;
  cells_.resize(static_cast<std::size_t>(count));
  Column left = column_at(kLowestU);
  for (int n = 0; n < count; ++n) {
    const Column right = column_at(kLowestU + (n + 1) * kWidth);
    Cell& cell = cells_[static_cast<std::size_t>(n)];
    const auto grid = hermite(left[0].grid, left[0].grid_by_u * kWidth, right[0].grid,
                              right[0].grid_by_u * kWidth);
    std::array<Nodes, 4> by_supply;
    for (std::size_t i = 0; i < kNodes; ++i) {
      const auto plate = hermite(left[i].plate, left[i].plate_by_u * kWidth, right[i].plate,
                                 right[i].plate_by_u * kWidth);
      for (std::size_t j = 0; j < 4; ++j) by_supply[j][i] = plate[j];
    }
    for (std::size_t j = 0; j < 4; ++j) {
      cell.grid[j] = grid[j];
      const Nodes coefficients = polynomial_through(supplies, by_supply[j]);
      for (std::size_t i = 0; i < kNodes; ++i) cell.plate[i][j] = coefficients[i];
    }
    left = right;
  }
}

}  // namespace kneeprint
