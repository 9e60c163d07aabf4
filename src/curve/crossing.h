// SPDX-License-Identifier: GPL-3.0-or-later
// Where a curve against drive passes a value: the drives of 0.1, 1, 3 % THD_F and of 1, 3 dB
// compression.
//
// Between neighbouring rungs THD_F is taken as a straight line in log percent against drive in dB
// (a power law of the drive; common practice), and gain as a straight line in dB against drive in
// dB. The uncertainty of the crossing is that of the curve there divided by the local slope (JCGM
// 100:2008 eq. 10 with dx/dy as the sensitivity). In the curve's own stands what the straight line
// may miss: a quadratic through the rungs around departs from it by |y''| s (1 - s) h^2 / 2 at
// share s of a step h (remainder of linear interpolation, Abramowitz & Stegun 1964, eq. 25.2.4),
// y'' being the larger second difference of the two beside the step.
#pragma once

#include <optional>
#include <vector>

#include "curve/points.h"

namespace kneeprint {

enum class Direction { up, down };  ///< of the curve with rising drive

struct Crossing {
  double drive = 0.0;  ///< in the unit of the points
  Direction direction = Direction::up;
  Cell expanded_u_db;  ///< 95 %; empty when a neighbouring rung states no uncertainty
};

/// The frequencies among the points, as played, ascending.
std::vector<double> frequencies_of(const std::vector<LevelPoint>& levels);

/// The points of one frequency, ascending in drive.
std::vector<LevelPoint> at_frequency(const std::vector<LevelPoint>& levels, double frequency_hz);

/// Every crossing of `percent` (> 0) by THD_F at that frequency, ascending in drive. Flagged rungs
/// and rungs without a THD are left out, and no line is drawn across them.
std::vector<Crossing> thd_crossings(const std::vector<LevelPoint>& levels, double frequency_hz,
                                    double percent);

/// Gain against that of the lowest usable rung: with an output, neither clipped by the rig nor
/// unsteady nor with its fundamental under the noise. On a reel, where gain is empty, output minus
/// drive serves: only differences count.
struct RelativeGain {
  double drive = 0.0;
  double db = 0.0;     ///< 0 at the reference, which comes first
  Cell expanded_u_db;  ///< 95 %, the noise of both fundamentals; scale terms cancel in the
                       ///< difference
};
/// The noise is that of the order 1 among the harmonics; without it the uncertainty is empty.
std::vector<RelativeGain> relative_gain(const Curves& curves, double frequency_hz);

/// First drive at which the gain has fallen by `drop` (> 0 dB); empty when it never does.
std::optional<Crossing> compression_point(const std::vector<RelativeGain>& gain, Decibels drop);

}  // namespace kneeprint
