// SPDX-License-Identifier: GPL-3.0-or-later
// The rig floor: what the rig alone shows, a cable in place of the unit, at the same converter
// levels.
#pragma once

#include <optional>
#include <vector>

#include "quantity/level.h"

namespace kneeprint {

/// Residual of the loop (send and return at the same level) for one order at one level.
struct FloorPoint {
  LevelDbfs level;
  int order = 2;
  Decibels relative;  ///< to the fundamental
};

class RigFloor {
 public:
  RigFloor() = default;  ///< unknown: at() answers nothing
  /// Sorted by itself. Every order needs at least one level.
  explicit RigFloor(std::vector<FloorPoint> points);

  /// Bound on the residual amplitude of `order` relative to the fundamental, with the send at
  /// `send` and the return at `ret`. Send and return shares cannot be told apart by a loop at equal
  /// levels, so both loop figures are added in magnitude (a bound). Between levels: linear in dB;
  /// below the lowest: its value; above the highest: nothing. Orders never measured: nothing.
  std::optional<double> at(LevelDbfs send, LevelDbfs ret, int order) const;

  const std::vector<FloorPoint>& points() const { return points_; }
  bool known() const { return !points_.empty(); }

 private:
  std::optional<double> loop(LevelDbfs level, int order) const;
  std::vector<FloorPoint> points_;
};

}  // namespace kneeprint
