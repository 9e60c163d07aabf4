// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/hold.h"

#include <algorithm>
#include <cmath>
#include <numbers>

namespace kneeprint {
namespace {

// Raised cosine from 0 to 1 over `length` samples.
double rise(std::size_t n, std::size_t length) {
  return 0.5 - 0.5 * std::cos(std::numbers::pi * (static_cast<double>(n) + 0.5) /
                              static_cast<double>(length));
}

// 1 inside [start, end), ramps of `ramp` samples outside, else 0.
double envelope(std::size_t n, std::size_t start, std::size_t end, std::size_t ramp) {
  if (n >= start && n < end) return 1.0;
  if (n < start) return start - n <= ramp ? rise(ramp - (start - n), ramp) : 0.0;
  return n - end < ramp ? rise(ramp - 1 - (n - end), ramp) : 0.0;
}

// Phase counted from `origin` modulo whole cycles, in exact arithmetic where f * n / rate is.
double cosine(Hertz f, Hertz rate, std::size_t n, std::size_t origin) {
  const double turns =
      f.value() * (static_cast<double>(n) - static_cast<double>(origin)) / rate.value();
  return std::cos(2.0 * std::numbers::pi * (turns - std::floor(turns)));
}

Hertz lowest_of(std::span<const Tone> tones) {
  return std::min_element(tones.begin(), tones.end(),
                          [](const Tone& a, const Tone& b) { return a.frequency < b.frequency; })
      ->frequency;
}

bool sounds_on(const Tone& tone, std::span<const Tone> tail_tones) {
  return std::any_of(tail_tones.begin(), tail_tones.end(),
                     [&](const Tone& t) { return t.frequency == tone.frequency; });
}

}  // namespace

Seconds ramp_length(Hertz lowest) { return std::max(Seconds(0.020), 4.0 * period(lowest)); }

HeldStimulus held_tones(std::span<const Tone> tones, Hertz rate, std::size_t block, int blocks,
                        std::span<const Tone> tail_tones, int tail_blocks) {
  const std::size_t margin = samples_in(kHoldMargin, rate);
  const std::size_t ramp = samples_in(ramp_length(lowest_of(tones)), rate);
  const bool has_tail = tail_blocks > 0 && !tail_tones.empty();

  HeldStimulus out;
  const Hertz lowest = lowest_of(tones);
  out.hold = held_layout(lowest, rate, block, blocks);
  const std::size_t open = margin + ramp;
  const std::size_t close = out.hold.end() + margin;
  std::size_t last_close = close;
  if (has_tail) {
    out.tail = tail_layout(lowest, rate, block, blocks, tail_blocks);
    last_close = out.tail.end() + margin;
  }
  out.wave.rate = rate;
  out.wave.samples.assign(held_length(lowest, rate, block, blocks, has_tail ? tail_blocks : 0),
                          0.0);
  for (const Tone& tone : tones) {
    const std::size_t end = has_tail && sounds_on(tone, tail_tones) ? last_close : close;
    for (std::size_t n = margin; n < end + ramp; ++n) {
      out.wave.samples[n] += tone.peak * envelope(n, open, end, ramp) *
                             cosine(tone.frequency, rate, n, out.hold.first_block);
    }
  }
  return out;
}

HoldLayout held_layout(Hertz lowest, Hertz rate, std::size_t block, int blocks) {
  return {2 * samples_in(kHoldMargin, rate) + samples_in(ramp_length(lowest), rate), block, blocks};
}

HeldStimulus held_period(std::span<const double> period, Hertz lowest, Hertz rate, int blocks) {
  const std::size_t margin = samples_in(kHoldMargin, rate);
  const std::size_t ramp = samples_in(ramp_length(lowest), rate);
  HeldStimulus out;
  out.hold = held_layout(lowest, rate, period.size(), blocks);
  const std::size_t close = out.hold.end() + margin;
  out.wave.rate = rate;
  out.wave.samples.assign(close + ramp + margin, 0.0);
  // Where in the period the first sample would stand, so that a block begins at hold.first_block.
  const std::size_t lead = period.size() - out.hold.first_block % period.size();
  for (std::size_t n = margin; n < close + ramp; ++n) {
    out.wave.samples[n] =
        period[(n + lead) % period.size()] * envelope(n, margin + ramp, close, ramp);
  }
  return out;
}

HoldLayout tail_layout(Hertz lowest, Hertz rate, std::size_t block, int blocks, int tail_blocks) {
  const std::size_t margin = samples_in(kHoldMargin, rate);
  const std::size_t ramp = samples_in(ramp_length(lowest), rate);
  return {held_layout(lowest, rate, block, blocks).end() + margin + ramp + margin, block,
          tail_blocks};
}

std::size_t held_length(Hertz lowest, Hertz rate, std::size_t block, int blocks, int tail_blocks) {
  const std::size_t margin = samples_in(kHoldMargin, rate);
  const HoldLayout last = tail_blocks > 0 ? tail_layout(lowest, rate, block, blocks, tail_blocks)
                                          : held_layout(lowest, rate, block, blocks);
  return last.end() + margin + samples_in(ramp_length(lowest), rate) + margin;
}

}  // namespace kneeprint
