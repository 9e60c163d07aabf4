// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/fill.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <vector>

namespace kneeprint {
namespace {

double chance_above(const BandAudibility& b) {
  if (!(b.u > 0.0)) return b.distortion > b.threshold ? 1.0 : 0.0;
  return 0.5 * std::erfc((b.threshold - b.distortion) / (b.u * std::numbers::sqrt2));
}

// Probabilities of 0, 1, .. n successes among independent draws with these chances.
std::vector<double> success_counts(std::span<const double> chances) {
  std::vector<double> p{1.0};
  for (const double c : chances) {
    p.push_back(0.0);
    for (std::size_t k = p.size() - 1; k > 0; --k) p[k] = p[k] * (1.0 - c) + p[k - 1] * c;
    p[0] *= 1.0 - c;
  }
  return p;
}

// Smallest count whose cumulative probability reaches `share`.
double quantile(std::span<const double> counts, double share) {
  double sum = 0.0;
  for (std::size_t k = 0; k < counts.size(); ++k) {
    sum += counts[k];
    if (sum >= share) return static_cast<double>(k);
  }
  return static_cast<double>(counts.size() - 1);
}

}  // namespace

FillReading fill_of(std::span<const BandAudibility> bands) {
  std::vector<double> chances;
  double expected = 0.0, undecided = 0.0;
  bool rig_hides = false;
  for (const BandAudibility& b : bands) {
    if (b.flag == Flag::none) {
      chances.push_back(chance_above(b));
      expected += chances.back();
    } else if (b.upper >= b.threshold) {
      undecided += 1.0;
      rig_hides |= b.flag == Flag::floor;
    }
  }
  const double percent = 100.0 / static_cast<double>(bands.size());
  if (chances.empty() && undecided > 0.0) {
    return {percent * undecided, std::nullopt, rig_hides ? Flag::floor : Flag::noise};
  }
  const std::vector<double> counts = success_counts(chances);
  const double low = quantile(counts, 0.025), high = quantile(counts, 0.975) + undecided;
  return {percent * expected, percent * std::max(high - expected, expected - low), Flag::none};
}

}  // namespace kneeprint
