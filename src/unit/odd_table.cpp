// SPDX-License-Identifier: GPL-3.0-or-later
#include "unit/odd_table.h"

namespace kneeprint {

OddTable::OddTable(const std::function<Sample(double)>& f, double range, double origin,
                   int cell_bits)
    : origin_(origin),
      limit_(origin),
      shift_(52 - cell_bits),
      first_cell_(std::bit_cast<std::uint64_t>(origin) >> shift_) {
  const auto cells_per_octave = static_cast<double>(std::uint64_t{1} << cell_bits);
  Sample left = f(0.0);
  double octave = origin;
  for (; octave - origin < range; octave *= 2.0) {
    const double width = octave / cells_per_octave;
    for (double i = 1.0; i <= cells_per_octave; i += 1.0) {
      const Sample right = f(octave + i * width - origin);
      const double rise = right.value - left.value;
      const double a = left.slope * width;
      const double b = right.slope * width;
      cells_.push_back({left.value, a, 3.0 * rise - 2.0 * a - b, a + b - 2.0 * rise});
      left = right;
    }
  }
  limit_ = octave - origin;
  cells_.push_back({left.value, 0.0, 0.0, 0.0});  // the end itself
}

}  // namespace kneeprint
