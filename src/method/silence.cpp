// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/silence.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

#include "method/coherent.h"
#include "method/hold.h"
#include "method/hum.h"
#include "method/noise_power.h"
#include "method/reading.h"
#include "method/tone_removal.h"
#include "signal/weighting.h"

namespace kneeprint {
namespace {

constexpr Hertz kTone{997.0};
constexpr Seconds kDuration{5.0}, kLeastDuration{2.0};
constexpr Seconds kLeastBlock{0.5};  // also the soft ends around a state: 20 Hz needs some length
constexpr int kRemovedOrders = 20;   // of 997 Hz: to 20 kHz
constexpr double kTimeConstants = 3.0;
constexpr Hertz kMeterRate{160000.0};  // what a quasi-peak meter needs at least
// Mean square of a -150 dBFS sine. The rounding of 24 bits alone makes -146 dBFS: below is no
// converter, but digital silence or what arithmetic leaves of it, whose lines mean nothing.
constexpr double kNothing = 0.5e-15;
constexpr double kBesideTone = 10.0;     // Hz
constexpr double kMostBesideTone = 0.1;  // of the state's noise

CoherentTone tone_of(const TakeSpec& spec, Hertz rate) {
  return coherent_tone(kTone, rate, std::max(spec.settings.block, kLeastBlock),
                       spec.settings.orders);
}

Seconds block_length(const TakeSpec& spec, Hertz rate) {
  return Seconds(static_cast<double>(tone_of(spec, rate).block) / rate.value());
}

int blocks_in(Seconds wanted, Seconds block) {
  return static_cast<int>(std::ceil(wanted / block - 1e-9));
}

int first_hold_blocks(const TakeSpec& spec, Hertz rate) {
  const Seconds wanted = std::max(spec.options.duration.value_or(kDuration), kLeastDuration);
  return blocks_in(wanted, block_length(spec, rate));
}

// Blocks before a state (the last of them is its soft beginning) and after it.
int lead_blocks(const TakeSpec& spec, Seconds block) {
  return std::max(1, blocks_in(kTimeConstants * spec.settings.longest_time_constant, block));
}
constexpr int kTailBlocks = 1;

struct Layout {
  Stimulus stimulus;
  std::size_t rest = 0, idle = 0;  // first samples of both states
};

Layout layout_of(const TakeSpec& spec, Hertz rate) {
  const CoherentTone tone = tone_of(spec, rate);
  const int lead = lead_blocks(spec, block_length(spec, rate));
  const int all = lead + spec.hold_blocks + kTailBlocks;
  const std::array tones{Tone{tone.frequency, sine_peak(spec.send)}};
  HeldStimulus held = held_tones(tones, rate, tone.block, all);
  const std::size_t zeros = tone.block * static_cast<std::size_t>(all);
  const std::size_t before = tone.block * static_cast<std::size_t>(lead);
  Layout out;
  out.rest = before;
  out.idle = zeros + held.hold.first_block + before;
  held.hold.first_block += zeros;
  held.wave.samples.insert(held.wave.samples.begin(), zeros, 0.0);
  out.stimulus = {std::move(held.wave), held.hold, tone.frequency};
  return out;
}

Stimulus stimulus(const TakeSpec& spec, Hertz rate) { return layout_of(spec, rate).stimulus; }

class StateReading {
 public:
  StateReading(const TakeSpec& spec, const TakeData& take, const RigView& rig, std::size_t first,
               bool has_tone);
  void read(Curves& out, Flag take_flag);

 private:
  ScalarPoint blank(const std::string& figure) const;
  ScalarPoint level_row(const std::string& figure, const Uncertain& power) const;
  Uncertain power(Weighting weighting) const;
  Uncertain quasi_peak() const;
  std::vector<double> inner(const Waveform& y) const;
  bool spread_beside_tone(double noise) const;
  void read_hum(Curves& out) const;

  const TakeSpec& spec_;
  const RigView& rig_;
  bool has_tone_;
  CoherentTone tone_;
  Hertz high_;
  Waveform piece_;       // the state with a soft block on either side
  NoiseSpectrum noise_;  // of the state alone
  Flag flag_ = Flag::none;
};

// The state and a block on either side, the mean and the tone taken out.
Waveform cut_piece(const Waveform& take, std::size_t first, std::size_t length, std::size_t soft) {
  const auto begin = take.samples.begin() + static_cast<long>(first - soft);
  Waveform piece{take.rate, {begin, begin + static_cast<long>(length + 2 * soft)}};
  double mean = 0.0;
  for (const double x : piece.samples) mean += x / static_cast<double>(piece.samples.size());
  for (double& x : piece.samples) x -= mean;
  return piece;
}

Waveform without_tone(Waveform piece, const CoherentTone& tone, bool has_tone) {
  if (has_tone) remove_tones(piece.samples, tone, kRemovedOrders);
  return piece;
}

Waveform middle_of(const Waveform& piece, std::size_t soft) {
  return {piece.rate,
          {piece.samples.begin() + static_cast<long>(soft),
           piece.samples.end() - static_cast<long>(soft)}};
}

StateReading::StateReading(const TakeSpec& spec, const TakeData& take, const RigView& rig,
                           std::size_t first, bool has_tone)
    : spec_(spec),
      rig_(rig),
      has_tone_(has_tone),
      tone_(tone_of(spec, take.response.rate)),
      high_(std::min(kBandHigh, kHighestShare * rig.usable_rate(take.response.rate))),
      piece_(without_tone(
          cut_piece(take.response, first, tone_.block * static_cast<std::size_t>(spec.hold_blocks),
                    tone_.block),
          tone_, has_tone)),
      noise_(middle_of(piece_, tone_.block), kHumSegment) {
  const std::size_t soft = tone_.block, size = piece_.samples.size();
  for (std::size_t n = 0; n < soft; ++n) {
    const double rise = 0.5 - 0.5 * std::cos(std::numbers::pi * (static_cast<double>(n) + 0.5) /
                                             static_cast<double>(soft));
    piece_.samples[n] *= rise;
    piece_.samples[size - 1 - n] *= rise;
  }
}

std::vector<double> StateReading::inner(const Waveform& y) const {
  const auto factor = static_cast<std::size_t>(std::lround(y.rate / piece_.rate));
  const auto soft = static_cast<long>(tone_.block * factor);
  return {y.samples.begin() + soft, y.samples.end() - soft};
}

Uncertain StateReading::power(Weighting weighting) const {
  const auto state = inner(weighted(piece_, weighting, kBandLow, high_));
  const Seconds length(static_cast<double>(state.size()) / piece_.rate.value());
  return mean_power(block_powers(state, spec_.hold_blocks),
                    gaussian_power_u(noise_, weighting, kBandLow, high_, length));
}

// The mean square of the sine that reads the same.
Uncertain StateReading::quasi_peak() const {
  const int oversampling = static_cast<int>(std::ceil(kMeterRate / piece_.rate));
  const Waveform y = weighted(piece_, itu468_weighting, kBandLow, high_, oversampling);
  const Uncertain r = quasi_peak_reading(inner(y), y.rate, spec_.hold_blocks);
  return {r.value * r.value, 2.0 * r.value * r.u, r.dof};
}

ScalarPoint StateReading::blank(const std::string& figure) const {
  ScalarPoint p;
  p.method = "silence";
  if (has_tone_) {
    const double own = std::abs(rig_.response.send(tone_.frequency).response);
    p.drive = rig_.send.level_of(spec_.send) + Decibels::of_ratio(own).value();
  }
  p.unit = rig_.ret.unit;
  p.figure = figure;
  p.state = has_tone_ ? "idle-with-bias" : "drive-free";
  p.value_unit = name(rig_.ret.unit);
  p.flag = flag_;
  return p;
}

ScalarPoint under_noise(ScalarPoint p) {
  const std::array flags{p.flag, Flag::noise};
  p.flag = gravest(flags);
  return p;
}

ScalarPoint StateReading::level_row(const std::string& figure, const Uncertain& power) const {
  ScalarPoint p = blank(figure);
  if (!(power.value > 0.0)) return under_noise(std::move(p));
  // The level of a sine of that rms.
  p.value = rig_.ret.level_of_peak(std::sqrt(2.0 * power.value));
  const std::array parts{Contribution{0.5 * kDbPerRelative * power.u / power.value, power.dof},
                         Contribution{rig_.ret.standard_uncertainty.value(), kInfiniteDof}};
  const Contribution c = combine(parts);
  p.expanded_u = coverage_factor_95(c.dof) * c.u;
  return p;
}

bool StateReading::spread_beside_tone(double noise) const {
  const double width = noise_.bin_hz();
  const auto centre = static_cast<std::size_t>(std::lround(tone_.frequency.value() / width));
  const auto nearest = static_cast<std::size_t>(std::ceil(kBesideTone / width)) + 2;
  const double level = noise_.around(centre, nearest, nearest + 24).density;
  double beside = 0.0;
  for (std::size_t k = 1; k < noise_.bins(); ++k) {
    const double f = static_cast<double>(k) * width;
    if (std::abs(f - tone_.frequency.value()) > kBesideTone) continue;
    beside += (noise_.density(k) - level) * width;
  }
  return beside > kMostBesideTone * noise;
}

void StateReading::read_hum(Curves& out) const {
  const Hum hum = find_hum(noise_, has_tone_ ? std::optional(tone_.frequency) : std::nullopt);
  for (const HumLine& line : hum.lines) {
    ScalarPoint p = level_row("hum", line.power);
    p.frequency_hz = line.frequency_hz;
    out.scalars.push_back(p);
  }
  if (hum.base_hz == 0) {
    ScalarPoint p = level_row("hum-total", {hum.limit, 0.0, kInfiniteDof});
    p.expanded_u.reset();  // a limit
    out.scalars.push_back(under_noise(std::move(p)));
    return;
  }
  out.scalars.push_back(level_row("hum-total", hum.total));
  ScalarPoint f = blank("mains-frequency");
  f.value = hum.frequency.value;
  f.value_unit = "Hz";
  f.expanded_u = expanded_95(hum.frequency);
  out.scalars.push_back(f);
}

void StateReading::read(Curves& out, Flag take_flag) {
  flag_ = take_flag;
  const Uncertain flat = power(flat_weighting);
  if (!(flat.value > kNothing)) {
    for (const char* figure : {"noise", "noise-a", "noise-468", "hum-total"}) {
      out.scalars.push_back(under_noise(blank(figure)));
    }
    return;
  }
  if (has_tone_ && spread_beside_tone(flat.value)) {
    const std::array flags{take_flag, Flag::unsteady};
    flag_ = gravest(flags);
  }
  out.scalars.push_back(level_row("noise", flat));
  out.scalars.push_back(level_row("noise-a", power(a_weighting)));
  out.scalars.push_back(level_row("noise-468", quasi_peak()));
  read_hum(out);
}

TakeVerdict read(const TakeSpec& spec, const TakeData& take, const RigView& rig, Curves& out) {
  const Layout layout = layout_of(spec, take.response.rate);
  TakeVerdict verdict;
  const HoldLayout whole{0, take.response.samples.size(), 1};
  verdict.clipped = reaches_full_scale(take.response, whole);
  const Flag flag = verdict.clipped ? Flag::clipped : Flag::none;
  StateReading(spec, take, rig, layout.rest, false).read(out, flag);
  StateReading(spec, take, rig, layout.idle, true).read(out, flag);
  return verdict;
}

}  // namespace

Method silence() {
  return {"silence",
          "noise and hum",
          "IEC 61672-1:2013; ITU-R BS.468-4; AES17-2015",
          Placement::before_ladder,
          {.id = "silence", .duration = true},
          first_hold_blocks,
          block_length,
          stimulus,
          read,
          nullptr};
}

}  // namespace kneeprint
