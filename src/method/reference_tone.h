// SPDX-License-Identifier: GPL-3.0-or-later
// Reference tone: the same steady sine at the ladder's lowest level, again and again between the
// steps, to see whether the gain drifts over the run (curve/stability.h judges that). Put it last
// among a plan's steps: it is then played after the other takes of each rung.
//
// Figure (curves/scalars.csv): reference-gain, dB, frequency_hz and drive as played, state "rung N"
// (N counts from 0). On a reel without declared levels it is output less drive, both in dBFS: only
// its differences count. expanded_u is type A alone (noise of return and, where there is one,
// reference return): calibration and rig floor are the same in every row and cancel in a drift.
#pragma once

#include "method/method.h"

namespace kneeprint {

Method reference_tone();

}  // namespace kneeprint
