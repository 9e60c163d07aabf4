// SPDX-License-Identifier: GPL-3.0-or-later
#include "rig/reel.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <complex>
#include <numbers>

#include "quantity/failure.h"
#include "signal/delay.h"
#include "signal/resample.h"

namespace kneeprint {
namespace {

constexpr Seconds kSilence{0.5}, kMarker{0.25}, kGap{0.3}, kBurst{0.04}, kEdge{0.005};
constexpr double kMarkerLow = 300.0, kMarkerHigh = 6000.0;
constexpr int kDigits = 8;  // hexadecimal
// A chirp through a saturator and filters still matches above 0.5; a stretch of noise or of another
// signal stays far below.
constexpr double kLeastMatch = 0.4;
constexpr double kLargestOffset = 1000e-6;

// Frequency of a hexadecimal digit: 100 Hz apart, so a 40 ms burst tells neighbours apart cleanly,
// and below their own second harmonics.
double digit_frequency(int digit) { return 1600.0 + 100.0 * digit; }

double gate(double t, double length) {
  const double edge = std::min(t, length - t) / kEdge.value();
  if (edge <= 0.0) return 0.0;
  return edge >= 1.0 ? 1.0 : 0.5 - 0.5 * std::cos(std::numbers::pi * edge);
}

// The marker at time t from its start: a linear chirp, so that its spectrum is flat over its band.
double marker_at(double t) {
  const double length = kMarker.value();
  if (t < 0.0 || t > length) return 0.0;
  const double sweep = (kMarkerHigh - kMarkerLow) / length;
  return gate(t, length) *
         std::sin(2.0 * std::numbers::pi * (kMarkerLow * t + 0.5 * sweep * t * t));
}

std::vector<double> marker(double samples_per_second) {
  std::vector<double> x(static_cast<std::size_t>(kMarker.value() * samples_per_second));
  for (std::size_t n = 0; n < x.size(); ++n)
    x[n] = marker_at(static_cast<double>(n) / samples_per_second);
  return x;
}

int digit_of(std::uint32_t code, int place) { return static_cast<int>(code >> (4 * place) & 0xF); }

struct Found {
  double at = 0.0;
  double match = 0.0;
  double gain = 0.0;
};

// The strongest likeness of the marker in [from, to) of the recording, searched in pieces so that
// an hour of recording costs no more memory than a minute.
Found search(const std::vector<double>& x, const std::vector<double>& known, long from, long to,
             bool earliest) {
  constexpr long kPiece = 1 << 19;
  Found best;
  from = std::max(0L, from);
  to = std::min(to, static_cast<long>(x.size()) - static_cast<long>(known.size()));
  for (long start = from; start < to; start += kPiece) {
    const long last = std::min(kPiece, to - start);
    const auto length = std::min(x.size() - static_cast<std::size_t>(start),
                                 static_cast<std::size_t>(last) + known.size());
    const Delay d = find_delay(known, std::span(x).subspan(static_cast<std::size_t>(start), length),
                               0, last - 1);
    if (d.match > best.match) best = {static_cast<double>(start) + d.samples, d.match, d.gain};
    // A programme may hold likenesses further on; the first clear one is the start marker.
    if (earliest && best.match > kLeastMatch) break;
  }
  return best;
}

std::uint32_t read_code(const Waveform& recording, const ReelLayout& layout,
                        const ReelFound& found) {
  std::uint32_t code = 0;
  const double rate = layout.rate.value();
  const auto burst = samples_in(kBurst, layout.rate);
  for (int place = 0; place < kDigits; ++place) {
    const double start =
        found.start +
        found.step * static_cast<double>(layout.code + burst * static_cast<std::size_t>(place));
    const std::vector<double> x = read_at(recording.samples, start, found.step, burst);
    int loudest = 0;
    double most = -1.0;
    for (int digit = 0; digit < 16; ++digit) {
      std::complex<double> sum = 0.0;
      for (std::size_t n = 0; n < x.size(); ++n) {
        sum += x[n] * std::polar(1.0, -2.0 * std::numbers::pi * digit_frequency(digit) *
                                          static_cast<double>(n) / rate);
      }
      if (std::abs(sum) > most) {
        most = std::abs(sum);
        loudest = digit;
      }
    }
    code |= static_cast<std::uint32_t>(loudest) << (4 * place);
  }
  return code;
}

}  // namespace

ReelLayout lay_out(std::span<const std::size_t> stimulus_lengths, Hertz rate) {
  ReelLayout layout;
  layout.rate = rate;
  const std::size_t gap = samples_in(kGap, rate), mark = samples_in(kMarker, rate);
  layout.start_marker = samples_in(kSilence, rate);
  layout.code = layout.start_marker + mark + gap;
  std::size_t at = layout.code + kDigits * samples_in(kBurst, rate) + gap;
  for (const std::size_t length : stimulus_lengths) {
    layout.slots.push_back({at, length});
    at += length + gap;
  }
  layout.end_marker = at;
  layout.length = at + mark + samples_in(kSilence, rate);
  return layout;
}

Waveform assemble(const ReelLayout& layout, const std::vector<Waveform>& stimuli,
                  std::uint32_t code, LevelDbfs level) {
  Waveform reel{layout.rate, std::vector<double>(layout.length, 0.0)};
  const double peak = sine_peak(level), rate = layout.rate.value();
  const std::size_t mark = samples_in(kMarker, layout.rate);
  for (std::size_t n = 0; n < mark; ++n) {
    const double x = peak * marker_at(static_cast<double>(n) / rate);
    reel.samples[layout.start_marker + n] = x;
    reel.samples[layout.end_marker + n] = x;
  }
  const std::size_t burst = samples_in(kBurst, layout.rate);
  for (int place = 0; place < kDigits; ++place) {
    const double f = digit_frequency(digit_of(code, place));
    for (std::size_t n = 0; n < burst; ++n) {
      const double t = static_cast<double>(n) / rate;
      reel.samples[layout.code + burst * static_cast<std::size_t>(place) + n] =
          peak * gate(t, kBurst.value()) * std::sin(2.0 * std::numbers::pi * f * t);
    }
  }
  for (std::size_t i = 0; i < stimuli.size(); ++i) {
    std::copy(stimuli[i].samples.begin(), stimuli[i].samples.end(),
              reel.samples.begin() + static_cast<long>(layout.slots[i].start));
  }
  return reel;
}

ReelFound find_reel(const Waveform& recording, const ReelLayout& layout, const std::string& file) {
  const double nominal = recording.rate / layout.rate;
  const std::vector<double> known = marker(recording.rate.value());
  const Found first =
      search(recording.samples, known, 0, static_cast<long>(recording.samples.size()), true);
  if (first.match < kLeastMatch) {
    throw InputError(fmt::format(
        "{}: no start marker found (best likeness {:.2f}, at least {:.2f} expected). Is this the "
        "recording of a reel, from before its first chirp on, and the right channel (--channel)?",
        file, first.match, kLeastMatch));
  }
  const double apart = nominal * static_cast<double>(layout.end_marker - layout.start_marker);
  const auto expected = static_cast<long>(std::lround(first.at + apart));
  const auto room = static_cast<long>(std::ceil(apart * kLargestOffset)) + 64;
  const Found last = search(recording.samples, known, expected - room, expected + room + 1, false);
  if (last.match < kLeastMatch) {
    const double missing = (static_cast<double>(expected) + static_cast<double>(known.size()) -
                            static_cast<double>(recording.samples.size())) /
                           recording.rate.value();
    if (missing > 0.0) {
      throw InputError(fmt::format(
          "{}: the recording ends {:.1f} s before the reel's end marker; record all of it", file,
          missing));
    }
    throw InputError(
        fmt::format("{}: no end marker where this reel has it, {:.2f} s after the start marker. It "
                    "is the recording "
                    "of another plan's reel, was edited, or ran at a speed off by more than 0.1 %",
                    file, apart / recording.rate.value()));
  }
  ReelFound found;
  const double measured = last.at - first.at;
  found.step = measured / static_cast<double>(layout.end_marker - layout.start_marker);
  found.start = first.at - found.step * static_cast<double>(layout.start_marker);
  found.clock_ppm = 1e6 * (found.step / nominal - 1.0);
  found.polarity = first.gain < 0.0 ? -1 : 1;
  found.code = read_code(recording, layout, found);
  return found;
}

void check_code(const ReelFound& found, std::uint32_t expected, const std::string& file) {
  if (found.code == expected) return;
  throw InputError(
      fmt::format("{}: this is the recording of another plan's reel (its code is {:08x}, this "
                  "folder's plan has "
                  "{:08x}); ingest it into the folder whose reel was played",
                  file, found.code, expected));
}

Waveform cut(const Waveform& recording, const ReelFound& found, const ReelLayout& layout,
             const ReelSlot& slot) {
  return {layout.rate,
          read_at(recording.samples, found.start + found.step * static_cast<double>(slot.start),
                  found.step, slot.length)};
}

}  // namespace kneeprint
