// SPDX-License-Identifier: GPL-3.0-or-later
#include "rig/reel.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <stdexcept>

#include "quantity/failure.h"
#include "rig/marker.h"
#include "rig/plan_code.h"
#include "signal/resample.h"

namespace kneeprint {
namespace {

constexpr Seconds kSilence{0.5}, kGap{0.3};
// Speeds are accepted up to 1 %, and a little more for what flutter moves the markers by.
constexpr double kLargestOffset = 0.0102, kSearched = 0.0125;
// Markers are placed to this; less is no drift, and no delay by a fraction of a sample.
constexpr double kNoDrift = 0.02;

// The markers of one reel in one recording.
class Search {
 public:
  Search(const Waveform& recording, const ReelLayout& layout, const std::string& file)
      : recording_(recording),
        layout_(layout),
        file_(file),
        rising_(Sweep::rising, layout.rate),
        falling_(Sweep::falling, layout.rate),
        nominal_(recording.rate / layout.rate),
        apart_(static_cast<double>(layout.end_marker - layout.start_marker)) {}

  ReelFound run(std::optional<std::uint32_t> expected_code) {
    if (recording_.rate < 2.2 * rising_.highest()) {
      refuse(fmt::format(
          "its sample rate, {:g} Hz, cannot hold this reel's markers of up to {:g} Hz; record at "
          "44100 Hz or more",
          recording_.rate.value(), rising_.highest().value()));
    }
    find_start();
    ReelFound found;
    place(found, nominal_ / first_.speed);
    found.code = code(found);
    if (expected_code) check_code(found, *expected_code, file_);
    find_end();
    // Before they are matched at one speed: bent by flutter, a marker may then look inverted.
    const double gain = (first_.match > last_.match ? first_ : last_).gain;
    refine();
    place(found, (last_.start - first_.start) / apart_);
    settle(found);
    found.clock_ppm = 1e6 * (found.step / nominal_ - 1.0);
    found.polarity = gain < 0.0 ? -1 : 1;
    found.match = std::min(first_.match, last_.match);
    if (std::abs(found.clock_ppm) > 1e6 * kLargestOffset) refuse_distance();
    return found;
  }

 private:
  [[noreturn]] void refuse(const std::string& sentence) const {
    throw InputError(file_ + ": " + sentence);
  }
  [[noreturn]] void refuse_distance() const {
    const double real = (last_.start - first_.start) / recording_.rate.value();
    const double wanted = apart_ / layout_.rate.value();
    refuse(fmt::format(
        "its markers stand {:.3f} s apart, this reel's {:.3f} s ({:+.2f} %): it was edited, ran "
        "at another speed, or is the recording of another plan's reel; record the reel again in "
        "one piece",
        real, wanted, 100.0 * (real / wanted - 1.0)));
  }

  long size() const { return static_cast<long>(recording_.samples.size()); }
  double seconds(double samples) const { return samples / recording_.rate.value(); }

  MarkerFound find(const Marker& marker, double step, double from, double to,
                   double speeds = kSearched) const {
    return find_marker(marker, recording_.samples, step * layout_.rate, std::lround(from),
                       std::lround(to), speeds);
  }

  void place(ReelFound& found, double step) const {
    found.step = step;
    found.start = first_.start - step * static_cast<double>(layout_.start_marker);
  }

  // A recording in the reel's own time is read as it is: what never drifted is not read between its
  // samples.
  void settle(ReelFound& found) const {
    if (std::abs(found.step - 1.0) * apart_ > kNoDrift) return;
    place(found, 1.0);
    if (std::abs(found.start - std::round(found.start)) < kNoDrift) {
      found.start = std::round(found.start);
    }
  }

  void find_start() {
    first_ = find(rising_, nominal_, 0.0, static_cast<double>(size()));
    if (!first_.clear()) {
      refuse(fmt::format(
          "no start marker found (best likeness {:.2f}). Is this the recording of a reel, from "
          "before its first chirp on, at its speed to 1 %, and the right channel (--channel)?",
          first_.match));
    }
  }

  std::uint32_t code(const ReelFound& found) const {
    const std::vector<double> heard =
        read_at(recording_.samples, found.start + found.step * static_cast<double>(layout_.code),
                found.step, plan_code_length(layout_.rate));
    const std::optional<std::uint32_t> code = read_plan_code(heard, layout_.rate);
    if (!code) {
      refuse(fmt::format(
          "the start marker stands at {:.2f} s, but the plan's code after it cannot be read; "
          "record the reel again, with less noise and without gates or echo",
          seconds(first_.start)));
    }
    return *code;
  }

  void find_end() {
    const double expected = first_.start + nominal_ * apart_;
    // A falling sweep at a wrong speed is found up to a millisecond off.
    const double room = nominal_ * apart_ * kSearched + 0.001 * recording_.rate.value();
    last_ = find(falling_, nominal_, expected - room, expected + room + 1.0);
    if (last_.clear()) return;
    last_ = find(falling_, nominal_, first_.start, static_cast<double>(size()));
    if (last_.clear()) refuse_distance();
    const double needed = expected + cycles(recording_.rate, Marker::kLength);
    const double missing = needed - static_cast<double>(size());
    if (missing > 0.0) {
      refuse(fmt::format(
          "the recording stops at {:.2f} s, {:.2f} s before the end of the reel's end marker; "
          "record all of it",
          seconds(static_cast<double>(size())), seconds(missing)));
    }
    refuse(fmt::format(
        "no end marker found; this reel has it {:.2f} s after the start marker, at {:.2f} s. Was "
        "the recording interrupted or edited? Record the reel again in one piece",
        seconds(nominal_ * apart_), seconds(expected)));
  }

  // A marker that runs at another speed is found late or early, as a sweep trades time for
  // frequency. Seen again at the speed just found, that error shrinks each time by the ratio of
  // reel to marker, at least 3. One that flutter bends too far for that stays where it was found.
  void refine() {
    constexpr int kPasses = 4;
    const double near = 0.001 * recording_.rate.value();
    for (int pass = 0; pass < kPasses; ++pass) {
      const double step = (last_.start - first_.start) / apart_;
      const auto again = [&](const Marker& marker, MarkerFound& found) {
        const MarkerFound here = find(marker, step, found.start - near, found.start + near, 0.0);
        if (here.clear()) found = here;
      };
      again(rising_, first_);
      again(falling_, last_);
    }
  }

  const Waveform& recording_;
  const ReelLayout& layout_;
  const std::string& file_;
  Marker rising_, falling_;
  double nominal_;  ///< samples of the recording per sample of the reel, by their nominal rates
  double apart_;    ///< samples of the reel from marker to marker
  MarkerFound first_, last_;
};

// rms over the 25 ms around every millisecond, which is longer than a period of 41 Hz.
std::vector<double> outline(std::span<const double> x, std::size_t before, Hertz rate) {
  const double step = 0.001 * rate.value(), half = 0.0125 * rate.value();
  std::vector<double> sums(x.size() + 1, 0.0);
  for (std::size_t n = 0; n < x.size(); ++n) sums[n + 1] = sums[n] + x[n] * x[n];
  const auto sum_to = [&](double position) {
    const double n = std::round(position) - static_cast<double>(before);
    return sums[static_cast<std::size_t>(std::clamp(n, 0.0, static_cast<double>(x.size())))];
  };
  const double end = static_cast<double>(x.size() + 2 * before);
  std::vector<double> out;
  for (double at = 0.0; at < end; at += step) {
    out.push_back(std::sqrt(std::max(0.0, sum_to(at + half) - sum_to(at - half))));
  }
  return out;
}

// Samples by which the outline of `stimulus` stands late in `around`, which holds it with `room`
// on either side; 0 within 3 ms, and when nothing there looks like it.
long lateness(const Waveform& stimulus, std::span<const double> around, std::size_t room) {
  constexpr long kFarthest = 150, kLeast = 3;  // ms
  constexpr double kAlike = 0.9;
  const std::vector<double> known = outline(stimulus.samples, room, stimulus.rate);
  const std::vector<double> heard = outline(around, 0, stimulus.rate);
  const auto count = static_cast<long>(std::min(known.size(), heard.size()));
  double best = kAlike;
  long late = 0;
  for (long lag = -kFarthest; lag <= kFarthest; ++lag) {
    // Pearson's coefficient over the milliseconds that both have at every lag.
    double n = 0, x = 0, y = 0, xx = 0, yy = 0, xy = 0;
    for (long k = kFarthest; k + kFarthest < count; ++k) {
      const double a = known[static_cast<std::size_t>(k)],
                   b = heard[static_cast<std::size_t>(k + lag)];
      n += 1, x += a, y += b, xx += a * a, yy += b * b, xy += a * b;
    }
    const double spread = (xx - x * x / n) * (yy - y * y / n);
    if (!(spread > 0.0)) continue;
    const double alike = (xy - x * y / n) / std::sqrt(spread);
    if (alike > best) best = alike, late = lag;
  }
  if (std::abs(late) <= kLeast) return 0;
  return std::lround(0.001 * static_cast<double>(late) * stimulus.rate.value());
}

}  // namespace

ReelLayout lay_out(std::span<const std::size_t> stimulus_lengths, Hertz rate) {
  ReelLayout layout;
  layout.rate = rate;
  const std::size_t gap = samples_in(kGap, rate), marker = samples_in(Marker::kLength, rate);
  layout.start_marker = samples_in(kSilence, rate);
  layout.code = layout.start_marker + marker + gap;
  std::size_t at = layout.code + plan_code_length(rate) + gap;
  for (const std::size_t length : stimulus_lengths) {
    layout.slots.push_back({at, length});
    at += length + gap;
  }
  layout.end_marker = at;
  layout.length = at + marker + samples_in(kSilence, rate);
  return layout;
}

Waveform assemble(const ReelLayout& layout, const std::vector<Waveform>& stimuli,
                  std::uint32_t code, LevelDbfs level) {
  if (stimuli.size() != layout.slots.size()) throw std::invalid_argument("one stimulus per slot");
  Waveform reel{layout.rate, std::vector<double>(layout.length, 0.0)};
  const auto put = [&](const std::vector<double>& x, std::size_t start, double gain) {
    for (std::size_t n = 0; n < x.size(); ++n) reel.samples[start + n] = gain * x[n];
  };
  const double peak = sine_peak(level);
  put(Marker(Sweep::rising, layout.rate).samples(layout.rate), layout.start_marker, peak);
  put(Marker(Sweep::falling, layout.rate).samples(layout.rate), layout.end_marker, peak);
  put(plan_code_sound(code, layout.rate), layout.code, peak);
  for (std::size_t i = 0; i < stimuli.size(); ++i) {
    if (stimuli[i].samples.size() != layout.slots[i].length || stimuli[i].rate != layout.rate) {
      throw std::invalid_argument("a stimulus must have its slot's length and the reel's rate");
    }
    put(stimuli[i].samples, layout.slots[i].start, 1.0);
  }
  return reel;
}

ReelFound find_reel(const Waveform& recording, const ReelLayout& layout, const std::string& file,
                    std::optional<std::uint32_t> expected_code) {
  return Search(recording, layout, file).run(expected_code);
}

void check_code(const ReelFound& found, std::uint32_t expected, const std::string& file) {
  if (found.code == expected) return;
  throw InputError(
      fmt::format("{}: this is the recording of another plan's reel (its code is {:08x}, this "
                  "folder's plan has {:08x}); ingest it into the folder whose reel was played",
                  file, found.code, expected));
}

Waveform cut(const Waveform& recording, const ReelFound& found, const ReelLayout& layout,
             const ReelSlot& slot, const Waveform& stimulus) {
  // The gap's 0.3 s on either side.
  const std::size_t room = samples_in(kGap, layout.rate);
  const double start = static_cast<double>(slot.start) - static_cast<double>(room);
  const std::vector<double> around = read_at(recording.samples, found.start + found.step * start,
                                             found.step, slot.length + 2 * room);
  const long late = lateness(stimulus, around, room);
  const auto first = around.begin() + static_cast<long>(room) + late;
  return {layout.rate, {first, first + static_cast<long>(slot.length)}};
}

}  // namespace kneeprint
