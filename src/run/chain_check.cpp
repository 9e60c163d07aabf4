// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/chain_check.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>

#include "quantity/failure.h"
#include "signal/delay.h"

namespace kneeprint {
namespace {

constexpr double kLowest = 100.0, kHighest = 10000.0;
constexpr Seconds kLength{0.4}, kRamp{0.02};
// A chirp through any unit that still resembles it correlates above this; noise and hum stay far
// below (0.4 s of white noise: 0.03 at most in practice).
constexpr double kLeastMatch = 0.2;

double rms(const std::vector<double>& x) {
  double sum = 0.0;
  for (const double v : x) sum += v * v;
  return std::sqrt(sum / static_cast<double>(std::max<std::size_t>(1, x.size())));
}

double peak(const std::vector<double>& x) {
  double p = 0.0;
  for (const double v : x) p = std::max(p, std::abs(v));
  return p;
}

}  // namespace

Waveform chain_check_stimulus(Hertz rate, LevelDbfs level) {
  const std::size_t length = samples_in(kLength, rate), ramp = samples_in(kRamp, rate);
  const double top = std::min(kHighest, 0.4 * rate.value());
  Waveform w{rate, std::vector<double>(length)};
  // Exponential sweep (Farina, 108th AES Convention, 2000): phase = 2 pi f1 L (exp(t / L) - 1).
  const double l = kLength.value() / std::log(top / kLowest);
  for (std::size_t n = 0; n < length; ++n) {
    const double t = static_cast<double>(n) / rate.value();
    const auto edge = static_cast<double>(std::min(n, length - 1 - n));
    const double gate =
        edge < static_cast<double>(ramp)
            ? 0.5 - 0.5 * std::cos(std::numbers::pi * edge / static_cast<double>(ramp))
            : 1.0;
    w.samples[n] = gate * sine_peak(level) *
                   std::sin(2.0 * std::numbers::pi * kLowest * l * (std::exp(t / l) - 1.0));
  }
  return w;
}

LevelDbfs chain_check_level(LevelDbfs lowest_rung, LevelDbfs ceiling) {
  constexpr LevelDbfs kQuiet{-40.0};
  return std::min({kQuiet, ceiling, std::max(lowest_rung, LevelDbfs(-60.0))});
}

ChainCheck judge_chain(const Waveform& stimulus, const std::vector<Waveform>& recorded) {
  const Waveform& returned = recorded.front();
  if (peak(returned.samples) >= 0.9999) {
    throw GuardStop(
        "chain check: the return clips although the send plays very quietly. Turn the input gain "
        "down, "
        "look for a loop between send and return (direct monitoring, a patched insert), then start "
        "again.");
  }
  if (rms(returned.samples) < 1e-7) {  // -137 dBFS: not even a converter's own noise
    throw NothingUsable(
        "chain check: nothing comes back, not even noise. Check that the unit is on, that its "
        "output is "
        "patched to the return that was named (--return), and that this input is switched on in "
        "the "
        "interface's mixer.");
  }
  const auto latest = static_cast<long>(returned.samples.size() - stimulus.samples.size());
  const Delay heard = find_delay(stimulus.samples, returned.samples, 0, latest);
  if (std::abs(heard.match) < kLeastMatch) {
    throw NothingUsable(fmt::format(
        "chain check: the return shows {:.1f} dBFS of something, but not what was sent (likeness "
        "{:.2f}, at least {:.2f} expected). Check the send (--send) and return (--return) "
        "channels, "
        "bypass and mute switches of the unit, and that no other program plays.",
        20.0 * std::log10(rms(returned.samples) * std::numbers::sqrt2), std::abs(heard.match),
        kLeastMatch));
  }
  ChainCheck check;
  check.delay = heard.samples;
  check.gain = Decibels::of_ratio(std::abs(heard.gain));
  check.polarity = heard.gain < 0.0 ? -1 : 1;
  check.match = std::abs(heard.match);
  if (recorded.size() > 1) {
    const Delay tapped = find_delay(stimulus.samples, recorded[1].samples, 0, latest);
    if (std::abs(tapped.match) < kLeastMatch) {
      throw NothingUsable(
          "chain check: the reference return does not carry the send. Check the cable that is to "
          "go "
          "straight from the send to the reference input (--reference), or leave the reference "
          "out.");
    }
    check.delay = tapped.samples;
  }
  check.sentence = fmt::format(
      "chain check: return found, gain {:+.2f} dB, {}, delay {:.2f} samples ({:.2f} ms)",
      check.gain.value(), check.polarity > 0 ? "upright" : "inverted", check.delay,
      1000.0 * check.delay / stimulus.rate.value());
  return check;
}

}  // namespace kneeprint
