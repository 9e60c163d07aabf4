// SPDX-License-Identifier: GPL-3.0-or-later
// The rig floor: the loop alone, a cable in place of the unit, measured by steady sines at several
// levels.
#pragma once

#include "rig/port.h"
#include "run/schedule.h"

namespace kneeprint {

/// Plays 997 Hz for 10 s at -60 .. 0 dBFS (every 10 dB, none above `ceiling`) over `cable`, and
/// reads the residual of orders 2 .. `orders`. Where the residual is under the noise, what the
/// noise allows (one standard uncertainty) stands for it.
RigFloor measure_floor(Port& cable, LevelDbfs ceiling, int orders);

}  // namespace kneeprint
