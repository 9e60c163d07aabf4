// SPDX-License-Identifier: GPL-3.0-or-later
// Plays one stimulus through the guard and records the returns: the body of the audio callback.
// Everything is allocated in the constructor; process() allocates nothing, locks nothing, throws
// nothing.
#pragma once

#include <atomic>
#include <cstddef>
#include <span>
#include <vector>

#include "rig/guard.h"
#include "signal/waveform.h"

namespace kneeprint {

class Player {
 public:
  /// `tail` samples are recorded after the stimulus ends (latency of the rig and more). Stimulus
  /// and guard outlive the player.
  Player(const Waveform& stimulus, std::size_t tail, bool with_reference, Guard& guard);
  Player(Waveform&&, std::size_t, bool, Guard&) = delete;

  /// One buffer of audio, of any size; `returned` and `out` are of the same. `reference` is too, or
  /// empty when none is wired. Returns false when done (all recorded, or the guard is silent); the
  /// Port then stops. Called again all the same, it records nothing and sends silence.
  bool process(std::span<const float> returned, std::span<const float> reference,
               std::span<float> out) noexcept;

  /// The Port reports what its driver flags (over- and underruns), from the callback.
  void count_dropout() noexcept { ++dropouts_; }

  /// A person stopped it: the guard's ramp begins in the next buffer.
  void mute() noexcept { guard_.mute(GuardReason::cancelled); }

  int dropouts() const { return dropouts_; }
  std::size_t recorded() const { return position_; }
  std::size_t length() const { return returned_.size(); }
  /// Share of the take that has passed, 0 .. 1 (1 for a take of no length); readable from any
  /// thread.
  double progress() const;
  const std::vector<float>& returned() const { return returned_; }
  const std::vector<float>& reference() const { return reference_; }

 private:
  const std::vector<double>& stimulus_;
  Guard& guard_;
  std::vector<float> returned_;
  std::vector<float> reference_;
  std::vector<double> silence_;
  std::atomic<std::size_t> position_{0};
  std::atomic<int> dropouts_{0};
};

}  // namespace kneeprint
