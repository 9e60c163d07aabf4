// SPDX-License-Identifier: GPL-3.0-or-later
// An odd function read from a table: for static device curves whose exact solution takes too long
// at an oversampled rate.
//
// Cells are equal within each octave of |x| + origin and twice as wide in the next, so the knee
// near zero is fine and the far range cheap; the cell is read off the bits of the number. Cubic
// Hermite within a cell (value and slope exact at its ends): error <= width^4 / 384 max|f''''|.
#pragma once

#include <bit>
#include <cmath>
#include <cstdint>
#include <functional>
#include <vector>

namespace kneeprint {

class OddTable {
 public:
  struct Sample {
    double value = 0.0;
    double slope = 0.0;
  };

  /// `f` gives value and slope for x >= 0, f(0) = 0. `origin`: power of two, about the knee's
  /// width; 2^`cell_bits` cells per octave. Covers |x| <= limit() >= `range`; holds its end value
  /// beyond.
  OddTable(const std::function<Sample(double)>& f, double range, double origin, int cell_bits);

  double limit() const { return limit_; }

  double operator()(double x) const {
    const double magnitude = std::fabs(x);
    const double position = (magnitude < limit_ ? magnitude : limit_) + origin_;
    const auto bits = std::bit_cast<std::uint64_t>(position);
    const Cell& cell = cells_[(bits >> shift_) - first_cell_];
    const double t = std::bit_cast<double>(kOne | ((bits << (52 - shift_)) & kMantissa)) - 1.0;
    return std::copysign(((cell.c3 * t + cell.c2) * t + cell.c1) * t + cell.c0, x);
  }

 private:
  struct Cell {
    double c0, c1, c2, c3;
  };
  static constexpr std::uint64_t kMantissa = (std::uint64_t{1} << 52) - 1;
  static constexpr std::uint64_t kOne = std::bit_cast<std::uint64_t>(1.0);

  double origin_;
  double limit_;
  int shift_;
  std::uint64_t first_cell_;
  std::vector<Cell> cells_;
};

}  // namespace kneeprint
