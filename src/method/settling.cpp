// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/settling.h"

#include <algorithm>
#include <cmath>
#include <limits>

namespace kneeprint {
namespace {

struct Remaining {
  double change = 0.0;  ///< dB, averaged over the kept blocks
  double u = 0.0;
};

// y_k = a + b q^k by least squares over blocks `from` .. end, for the time constant on a
// logarithmic grid that fits best.
Remaining remaining_change(const BlockTrend& trend, int from, int first, Seconds block,
                           Seconds longest) {
  const auto count = static_cast<int>(trend.decibels.size());
  // Gone within a block (e^-10): what a fast transient leaves in the first block says nothing of
  // the rest.
  const double shortest = block.value() / 10.0;
  const double top = std::max(longest.value(), shortest);
  constexpr int kGrid = 24;
  double best_residual = std::numeric_limits<double>::infinity();
  Remaining best;
  for (int g = 0; g < kGrid; ++g) {
    const double tau = shortest * std::pow(top / shortest, g / (kGrid - 1.0));
    const double q = std::exp(-block.value() / tau);
    double n = 0, s = 0, ss = 0, y = 0, sy = 0;
    double e = 1.0;  // q^(k - from)
    for (int k = from; k < count; ++k, e *= q) {
      n += 1, s += e, ss += e * e, y += trend.decibels[k], sy += e * trend.decibels[k];
    }
    const double det = n * ss - s * s;
    if (det <= 1e-12 * n * ss) continue;
    const double b = (n * sy - s * y) / det;
    const double a = (y - b * s) / n;
    double residual = 0, kept = 0;
    e = 1.0;
    for (int k = from; k < count; ++k, e *= q) {
      const double r = trend.decibels[k] - a - b * e;
      residual += r * r;
      if (k >= first) kept += e / (count - first);
    }
    if (residual < best_residual) {
      best_residual = residual;
      best = {std::abs(b) * kept, trend.sigma * std::sqrt(n / det) * kept};
    }
  }
  return best;
}

}  // namespace

Settled find_settled(std::span<const BlockTrend> trends, int blocks, int keep, Seconds block,
                     Seconds longest_time_constant, Decibels wanted) {
  for (int first = 0; first + keep <= blocks; ++first) {
    // One block before the kept ones is in the fit too: three kept blocks alone cannot hold a fit
    // of three parameters.
    const int from = std::max(0, first - 1);
    const bool all = std::all_of(trends.begin(), trends.end(), [&](const BlockTrend& t) {
      const Remaining r = remaining_change(t, from, first, block, longest_time_constant);
      return r.change <= std::max(wanted.value(), 3.0 * r.u);
    });
    if (all) return {true, first};
  }
  return {false, blocks - keep};
}

}  // namespace kneeprint
