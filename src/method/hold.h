// SPDX-License-Identifier: GPL-3.0-or-later
// The stimulus of every steady method: silence, a raised-cosine rise, whole blocks of steady tones,
// a raised-cosine fall, silence.
#pragma once

#include <span>
#include <vector>

#include "method/method.h"

namespace kneeprint {

struct Tone {
  Hertz frequency;
  double peak = 0.0;  ///< sample value; cosine, phase 0 at the first block's start
};

/// At least 20 ms and 4 periods of the lowest tone: shorter ramps drive a transformer's flux to 1.8
/// times its steady peak (common practice; see DEVELOPERS.md, "Ramps").
Seconds ramp_length(Hertz lowest);

/// Silence kept before and after, and steady time left between ramp and first block, so that
/// filters' ringing and a fraction of delay never reach a block.
inline constexpr Seconds kHoldMargin{0.010};

/// `tones` held for `blocks` blocks of `block` samples. When `tail_blocks` > 0, the tones marked by
/// `tail` sound on alone for that many blocks after the others have faded; `tail_start` then tells
/// where.
struct HeldStimulus {
  Waveform wave;
  HoldLayout hold;
  HoldLayout tail;
};
HeldStimulus held_tones(std::span<const Tone> tones, Hertz rate, std::size_t block, int blocks,
                        std::span<const Tone> tail_tones = {}, int tail_blocks = 0);

/// Where held_tones() and held_period() put the blocks, without making a sample.
HoldLayout held_layout(Hertz lowest, Hertz rate, std::size_t block, int blocks);
/// One block repeated under the same silence, rise and fall; `lowest` tone of it sets the ramps.
HeldStimulus held_period(std::span<const double> period, Hertz lowest, Hertz rate, int blocks);
/// The same for the blocks of a tail.
HoldLayout tail_layout(Hertz lowest, Hertz rate, std::size_t block, int blocks, int tail_blocks);
/// Samples of the whole stimulus.
std::size_t held_length(Hertz lowest, Hertz rate, std::size_t block, int blocks,
                        int tail_blocks = 0);

}  // namespace kneeprint
