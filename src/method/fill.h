// SPDX-License-Identifier: GPL-3.0-or-later
// Fill: the share of auditory bands in which distortion stands above what the tones mask.
#pragma once

#include <span>

#include "curve/points.h"

namespace kneeprint {

/// One band; powers in any one unit.
struct BandAudibility {
  double threshold = 0.0;   ///< from which distortion is heard
  double distortion = 0.0;  ///< as read
  double u = 0.0;           ///< standard uncertainty of it
  double upper = 0.0;       ///< 95 % upper limit, used when the distortion was not seen
  /// none: the distortion is the unit's; noise: not seen; floor: at or under what the rig shows.
  Flag flag = Flag::none;
};

struct FillReading {
  double percent = 0.0;
  Cell expanded_u;  ///< 95 %, in percent; empty for an upper limit
  Flag flag = Flag::none;
};

/// A band whose distortion was seen counts with the probability that it is above the threshold
/// (normal, JCGM 100:2008 G.1); the number of such bands is then a sum of independent yes-or-no
/// draws, whose 2.5 and 97.5 % quantiles are computed in full (Poisson binomial; a propagation of
/// distributions as in JCGM 101:2008, in closed form). A band whose distortion was not seen counts
/// as empty; where even its upper limit reaches the threshold it is undecided and extends the
/// interval upwards. When no band was seen and some are undecided, the figure is an upper limit:
/// the share of the undecided, flagged noise (floor, when the rig alone hides any).
/// `bands` is not empty.
FillReading fill_of(std::span<const BandAudibility> bands);

}  // namespace kneeprint
