// SPDX-License-Identifier: GPL-3.0-or-later
#include "curve/floor.h"

#include <algorithm>
#include <tuple>

namespace kneeprint {

RigFloor::RigFloor(std::vector<FloorPoint> points) : points_(std::move(points)) {
  std::sort(points_.begin(), points_.end(), [](const FloorPoint& a, const FloorPoint& b) {
    return std::tie(a.order, a.level) < std::tie(b.order, b.level);
  });
}

std::optional<double> RigFloor::loop(LevelDbfs level, int order) const {
  constexpr double kRounding = 1e-6;  // dB: a level read back from a take
  const auto of_order = [](const FloorPoint& p, int n) { return p.order < n; };
  const auto first = std::lower_bound(points_.begin(), points_.end(), order, of_order);
  const auto last = std::lower_bound(first, points_.end(), order + 1, of_order);
  if (first == last) return std::nullopt;
  if (level.value() <= first->level.value() + kRounding) return first->relative.ratio();
  const auto above = std::find_if(first + 1, last, [&](const FloorPoint& p) {
    return p.level.value() >= level.value() - kRounding;
  });
  if (above == last) return std::nullopt;
  const auto below = above - 1;
  const double share = (level - below->level).value() / (above->level - below->level).value();
  return (below->relative + share * (above->relative - below->relative)).ratio();
}

std::optional<double> RigFloor::at(LevelDbfs send, LevelDbfs ret, int order) const {
  const auto sent = loop(send, order), returned = loop(ret, order);
  if (!sent || !returned) return std::nullopt;
  return *sent + *returned;
}

}  // namespace kneeprint
