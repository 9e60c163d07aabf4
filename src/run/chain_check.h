// SPDX-License-Identifier: GPL-3.0-or-later
// Before the ladder, at low level: is there a return on this input, with which gain, polarity and
// delay, and is it clear of its end? If not, says what to check, and nothing louder is played.
#pragma once

#include <string>
#include <vector>

#include "rig/port.h"

namespace kneeprint {

struct ChainCheck {
  double delay = 0.0;  ///< samples from send to return
  Decibels gain{0.0};  ///< return over send, in converter levels
  int polarity = 1;
  double match = 0.0;    ///< correlation with what was sent, 0 .. 1
  std::string sentence;  ///< for the progress line
};

/// A chirp from 100 Hz to 10 kHz, 0.4 s, at a level of at most -40 dBFS and at most `ceiling`.
Waveform chain_check_stimulus(Hertz rate, LevelDbfs level);
LevelDbfs chain_check_level(LevelDbfs lowest_rung, LevelDbfs ceiling);

/// Judges what came back (the return, then the reference when there is one; the delay is the
/// reference's then). Throws NothingUsable (no return, or none like what was sent) or GuardStop
/// (clips), with what to check.
ChainCheck judge_chain(const Waveform& stimulus, const std::vector<Waveform>& recorded);

}  // namespace kneeprint
