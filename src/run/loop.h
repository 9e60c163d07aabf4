// SPDX-License-Identifier: GPL-3.0-or-later
// A cable, or a known pad, in place of the unit: what the rig alone shows at both converters'
// levels.
#pragma once

#include <string>
#include <vector>

#include "rig/port.h"
#include "rig/rig_file.h"
#include "run/progress.h"

namespace kneeprint {

struct LoopRequest {
  std::vector<Hertz> frequencies{Hertz(997.0)};  ///< of the tones whose harmonics are read
  int orders = 10;
  Seconds integration{10.0};  ///< of each take; the floor read is no lower than its noise
  bool products = false;      ///< intermodulation of the two-tone methods, too
  bool response = false;      ///< the loop's linear response, by a swept sine
  LevelDbfs ceiling{0.0};  ///< highest send; levels go down from it in steps of 10 dB to -60 dBFS
};

struct LoopResult {
  std::vector<FloorPoint> floor;
  std::vector<LoopPoint> response;  ///< relative to 997 Hz; empty when not asked for
  Decibels gain{0.0};               ///< return over send in converter levels, at the lowest send
};

/// Plays every take through the guard, lowest level first. Residuals are complex means over the
/// whole integration; under the noise their magnitude is what the noise leaves possible. Throws
/// NothingUsable (nothing comes back), GuardStop (the return clips), DeviceError.
LoopResult measure_loop(Port& cable, const LoopRequest& request, Progress& progress);

/// `rig` with what the loop showed: earlier points of the same path (gains less than 1 dB apart)
/// are replaced, those of other pads stay.
void add_loop(Rig& rig, const LoopResult& loop);

}  // namespace kneeprint
