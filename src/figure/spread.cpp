// SPDX-License-Identifier: GPL-3.0-or-later
#include "figure/spread.h"

#include <algorithm>
#include <numeric>

namespace kneeprint {

std::vector<double> spread_labels(const std::vector<double>& wanted, double gap, double low,
                                  double high) {
  const std::size_t n = wanted.size();
  if (n == 0) return {};
  if (n > 1) gap = std::min(gap, (high - low) / static_cast<double>(n - 1));
  std::vector<std::size_t> order(n);
  std::iota(order.begin(), order.end(), std::size_t{0});
  std::stable_sort(order.begin(), order.end(),
                   [&](std::size_t a, std::size_t b) { return wanted[a] < wanted[b]; });

  // Taking k * gap off the k-th label turns "at least gap apart" into "not descending".
  struct Pool {
    double sum;
    std::size_t count;
    double mean() const { return sum / static_cast<double>(count); }
  };
  std::vector<Pool> pools;
  for (std::size_t k = 0; k < n; ++k) {
    pools.push_back({wanted[order[k]] - static_cast<double>(k) * gap, 1});
    while (pools.size() > 1 && pools[pools.size() - 2].mean() > pools.back().mean()) {
      pools[pools.size() - 2].sum += pools.back().sum;
      pools[pools.size() - 2].count += pools.back().count;
      pools.pop_back();
    }
  }
  std::vector<double> placed(n);
  const double room = high - static_cast<double>(n - 1) * gap;
  std::size_t k = 0;
  for (const auto& pool : pools)
    for (std::size_t i = 0; i < pool.count; ++i, ++k)
      placed[order[k]] =
          std::clamp(pool.mean(), low, std::max(low, room)) + static_cast<double>(k) * gap;
  return placed;
}

}  // namespace kneeprint
