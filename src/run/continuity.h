// SPDX-License-Identifier: GPL-3.0-or-later
// Frames lost or repeated that no driver flagged, and send and return on different clocks, found
// from the take itself: its steady part repeats from block to block, so the difference between
// blocks is noise, unless time has jumped.
#pragma once

#include <optional>
#include <string>

#include "method/method.h"

namespace kneeprint {

struct Continuity {
  bool jumped = false;     ///< frames lost or repeated
  double at_s = 0.0;       ///< about where, from the take's start
  double clock_ppm = 0.0;  ///< the return's clock against the send's, steady over the take
};

/// Never throws. Fewer than two blocks: nothing can be said.
Continuity check_continuity(const Waveform& take, const HoldLayout& hold);

}  // namespace kneeprint
