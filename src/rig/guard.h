// SPDX-License-Identifier: GPL-3.0-or-later
// The last stage before the converter. Nothing bypasses it: a Port takes its samples from a Player,
// and a Player's only way out is Guard::process.
//
// Per sample, after everything else: not-a-number or infinity mutes; a magnitude over the ceiling
// mutes (a plan that asks for too much is wrong, so it is stopped rather than bent: a clipped
// stimulus would be measured as the unit's distortion). Every start and every mute is a ramp.
// A tripped guard stays tripped: process() then writes zeros after its ramp.
//
// Real-time safe: process() and mute() allocate nothing, lock nothing and throw nothing.
#pragma once

#include <atomic>
#include <cstddef>
#include <span>
#include <string>

#include "quantity/level.h"

namespace kneeprint {

enum class GuardReason : int {
  none = 0,
  not_a_number,  ///< the program asked for NaN or infinity
  over_ceiling,  ///< the program asked for more than the ceiling
  return_hot,    ///< the return reached its limit
  cancelled,     ///< a person stopped it
};
std::string_view name(GuardReason reason);  ///< stable id for the journal: "over-ceiling", ...
std::string sentence(GuardReason reason);   ///< plain words: what happened and what to do

struct GuardLimits {
  LevelDbfs ceiling{-20.0};      ///< peak sample = that of a sine at this level
  LevelDbfs return_limit{-0.1};  ///< |return| at or over this peak mutes
  Seconds mute_ramp{0.003};      ///< raised cosine
};

class Guard {
 public:
  Guard(GuardLimits limits, Hertz rate);

  /// Copies `wanted` to `out` (same size) within the limits. While the ramp runs it fades `wanted`;
  /// from the first sample that cannot be used on, it fades the last good one instead.
  void process(std::span<const double> wanted, std::span<float> out) noexcept;
  /// Looks at what came back; mutes at the return limit or at NaN.
  void watch(std::span<const float> returned) noexcept;
  /// Begins the mute ramp at the next sample. The first reason stays. Callable from any thread.
  void mute(GuardReason reason) noexcept;

  GuardReason reason() const noexcept;  ///< none while it has not tripped
  bool silent() const noexcept;         ///< tripped and its ramp has ended
  const GuardLimits& limits() const { return limits_; }

 private:
  GuardLimits limits_;
  double ceiling_peak_;
  float return_peak_;
  double ramp_samples_;       ///< whole, at least 1
  double ramped_ = 0.0;       ///< of those, so many have passed; touched by the audio thread alone
  double last_sample_ = 0.0;  ///< last good one: what the ramp fades
  bool follows_ = true;       ///< `wanted` has been usable so far
  std::atomic<int> reason_{0};
  std::atomic<bool> silent_{false};
};

}  // namespace kneeprint
