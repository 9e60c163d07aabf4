// SPDX-License-Identifier: GPL-3.0-or-later
// The ladder taken up and down again: does the unit come back the same way?
//
// At each frequency and drive with both directions gain and H2 .. H5 (levels over the drive) are
// compared, down minus up. The uncertainty is type A alone: calibration and rig floor are common to
// both and cancel; a drift of the gain that the reference tone shows
// (curve/stability.h) is added, once for each direction. The largest difference of each figure,
// counted in its own standard uncertainties, is reported; it is beyond them when it passes
// Student's quantile at 5 % divided by the number of all comparisons of the measurement
// (Bonferroni).
#pragma once

#include "curve/points.h"

namespace kneeprint {

/// Appends, per frequency and figure, a row `ladder-loop-gain`, `ladder-loop-h2` .. `-h5` (dB, at
/// the drive where it stands): down minus up, or, when it lies within the uncertainty, a 95 %
/// upper limit of its size there under Flag::noise. Points with a flag are not compared. Nothing
/// to compare, as without a way down: no rows.
void add_hysteresis(Curves& curves);

/// Without the points of the way down: a single-valued ladder for those who need one.
Curves ascending(Curves curves);

}  // namespace kneeprint
