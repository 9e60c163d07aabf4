// SPDX-License-Identifier: GPL-3.0-or-later
#include "rig/guard.h"

#include <algorithm>
#include <cmath>
#include <numbers>

namespace kneeprint {

std::string_view name(GuardReason reason) {
  switch (reason) {
    case GuardReason::none:
      return "";
    case GuardReason::not_a_number:
      return "not-a-number";
    case GuardReason::over_ceiling:
      return "over-ceiling";
    case GuardReason::return_hot:
      return "return-hot";
    case GuardReason::cancelled:
      return "cancelled";
  }
  return "";
}

std::string sentence(GuardReason reason) {
  switch (reason) {
    case GuardReason::none:
      return "";
    case GuardReason::not_a_number:
      return "the guard muted the send: the program asked for a sample that is no number. "
             "This is a fault of the program; please report it with the plan.";
    case GuardReason::over_ceiling:
      return "the guard muted the send: the program asked for more than the ceiling allows. "
             "This is a fault of the program; please report it with the plan.";
    case GuardReason::return_hot:
      return "the guard muted the send: the return reached full scale. "
             "Turn the input gain down or put a pad before the return; if the level stays although "
             "the send is silent, a loop is closed outside this program: turn down or unplug it.";
    case GuardReason::cancelled:
      return "the send was muted by hand; what was taken is kept (--resume goes on)";
  }
  return "";
}

static_assert(std::atomic<int>::is_always_lock_free && std::atomic<bool>::is_always_lock_free,
              "the audio thread takes no lock");

Guard::Guard(GuardLimits limits, Hertz rate)
    : limits_(limits),
      // A rung at the ceiling itself must pass: room for the rounding of a cosine and of a float.
      ceiling_peak_(sine_peak(limits.ceiling) * (1.0 + 1e-6)),
      return_peak_(static_cast<float>(sine_peak(limits.return_limit))),
      // Counted in whole samples: a sum of fractions would end one late.
      ramp_samples_(std::max(1.0, std::ceil(limits.mute_ramp.value() * rate.value() - 1e-9))) {}

void Guard::process(std::span<const double> wanted, std::span<float> out) noexcept {
  for (std::size_t n = 0; n < out.size(); ++n) {
    const double x = wanted[n];
    if (!std::isfinite(x)) {
      mute(GuardReason::not_a_number);
      follows_ = false;
    } else if (!(std::abs(x) <= ceiling_peak_)) {  // so that a ceiling that is NaN lets nothing out
      mute(GuardReason::over_ceiling);
      follows_ = false;
    }
    // A program that asked for the impossible is not believed again: what it asks next may be
    // anything, and following it would put steps into the ramp.
    if (follows_) last_sample_ = x;
    if (reason_.load(std::memory_order_relaxed) == 0) {
      out[n] = static_cast<float>(x);
      continue;
    }
    ramped_ = std::min(ramp_samples_, ramped_ + 1.0);
    if (ramped_ >= ramp_samples_) {
      out[n] = 0.0f;
      silent_.store(true, std::memory_order_release);
      continue;
    }
    const double gain = 0.5 + 0.5 * std::cos(std::numbers::pi * ramped_ / ramp_samples_);
    out[n] = static_cast<float>(gain * last_sample_);
  }
}

void Guard::watch(std::span<const float> returned) noexcept {
  for (const float x : returned) {
    // Written so that NaN, too, counts as hot.
    if (!(std::abs(x) < return_peak_)) mute(GuardReason::return_hot);
  }
}

void Guard::mute(GuardReason reason) noexcept {
  int none = 0;
  reason_.compare_exchange_strong(none, static_cast<int>(reason));
}

GuardReason Guard::reason() const noexcept { return static_cast<GuardReason>(reason_.load()); }

bool Guard::silent() const noexcept { return silent_.load(std::memory_order_acquire); }

}  // namespace kneeprint
