// SPDX-License-Identifier: GPL-3.0-or-later
// The rig floor: what the rig alone shows, a cable (or a known pad) in place of the unit.
//
// What a loop shows is the sum of the send's share, which depends on the send's level, and of the
// return's, which depends on the return's. A unit between them may turn one against the other (an
// inverting one does so with every even order), so the two are bounded apart and added in
// magnitude. A pad in the loop brings the return down until the send's share stands alone.
#pragma once

#include <optional>
#include <string>
#include <string_view>
#include <vector>

#include "quantity/level.h"

namespace kneeprint {

/// Residual of the loop for one line at one pair of converter levels.
struct FloorPoint {
  LevelDbfs level;                 ///< send, rms of the sine with the same peak
  int order = 2;                   ///< of the harmonic; 0 for an intermodulation product
  Decibels relative;               ///< to the fundamental (products: to their method's reference)
  std::optional<LevelDbfs> ret{};  ///< level at the return; empty: as the send
  Hertz frequency{0.0};            ///< of the fundamental; 0: stands for every frequency
  std::string product{};           ///< "smpte m2"; empty for harmonics
  std::optional<double> phase_deg{};  ///< referred to the fundamental, as in harmonics.csv

  LevelDbfs return_level() const { return ret.value_or(level); }
};

class RigFloor {
 public:
  RigFloor() = default;  ///< unknown: at() answers nothing
  /// Sorted by itself. Every line needs at least one level.
  explicit RigFloor(std::vector<FloorPoint> points);

  /// Bound on the residual amplitude of `order` relative to the fundamental, with the send at
  /// `send` and the return at `ret`: the loop's figure at that send level with the lowest return
  /// level measured there, plus its figure at that return level with the lowest send level. Between
  /// levels: linear in dB; below the lowest: its value; above the highest: nothing. Between
  /// frequencies the larger neighbour counts, beyond the outermost the outermost; `frequency` 0
  /// asks for the largest of all. Orders never measured: nothing.
  std::optional<double> at(LevelDbfs send, LevelDbfs ret, int order,
                           Hertz frequency = Hertz(0.0)) const;
  /// The same for an intermodulation product, relative to its method's reference.
  std::optional<double> at_product(LevelDbfs send, LevelDbfs ret, std::string_view method,
                                   std::string_view product) const;

  const std::vector<FloorPoint>& points() const { return points_; }
  bool known() const { return !points_.empty(); }

 private:
  std::vector<FloorPoint> points_;
};

}  // namespace kneeprint
