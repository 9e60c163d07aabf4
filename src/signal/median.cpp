// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/median.h"

#include <algorithm>
#include <cstddef>

namespace kneeprint {
namespace {

// Moves what `belongs` to the front, in one pass whose steps do not depend on the data.
template <class Belongs>
std::size_t gather(std::span<double> values, Belongs belongs) {
  std::size_t front = 0;
  for (double& here : values) {
    const double value = here;
    here = values[front];
    values[front] = value;
    front += belongs(value) ? 1 : 0;
  }
  return front;
}

double middle_of(double a, double b, double c) {
  return std::max(std::min(a, b), std::min(std::max(a, b), c));
}

}  // namespace

// Hoare's selection (Comm. ACM 4, 1961, algorithm 65), pivot by the median of three, in three
// parts: below, equal, above.
double upper_median(std::span<double> values) {
  std::size_t wanted = values.size() / 2;
  while (values.size() > 1) {
    const double pivot = middle_of(values.front(), values[values.size() / 2], values.back());
    const std::size_t below = gather(values, [&](double v) { return v < pivot; });
    if (wanted < below) {
      values = values.first(below);
      continue;
    }
    values = values.subspan(below);
    wanted -= below;
    const std::size_t equal = gather(values, [&](double v) { return v <= pivot; });
    if (wanted < equal || equal == 0) return pivot;  // 0: the pivot is not a number
    values = values.subspan(equal);
    wanted -= equal;
  }
  return values.front();
}

}  // namespace kneeprint
