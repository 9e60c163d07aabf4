// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/steady.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

#include "method/coherent.h"
#include "method/hold.h"
#include "method/reading.h"
#include "method/rig_curvature.h"
#include "method/time_base.h"

namespace kneeprint {
namespace {

constexpr double kDegrees = 180.0 / std::numbers::pi;

CoherentTone tone_of(const TakeSpec& spec, Hertz rate) {
  return coherent_tone(spec.asked, rate, spec.settings.block, spec.settings.orders);
}

Seconds block_length(const TakeSpec& spec, Hertz rate) {
  return Seconds(static_cast<double>(tone_of(spec, rate).block) / rate.value());
}

int first_hold_blocks(const TakeSpec& spec, Hertz rate) {
  return kept_blocks(spec.settings, block_length(spec, rate)) + 1;
}

Stimulus stimulus(const TakeSpec& spec, Hertz rate) {
  const CoherentTone tone = tone_of(spec, rate);
  const std::array tones{Tone{tone.frequency, sine_peak(spec.send)}};
  HeldStimulus held = held_tones(tones, rate, tone.block, spec.hold_blocks);
  return {std::move(held.wave), held.hold, tone.frequency};
}

HoldLayout layout_of(const CoherentTone& tone, const TakeSpec& spec, Hertz rate) {
  return held_layout(tone.frequency, rate, tone.block, spec.hold_blocks);
}

std::size_t length(const TakeSpec& spec, Hertz rate) {
  const CoherentTone tone = tone_of(spec, rate);
  return held_length(tone.frequency, rate, tone.block, spec.hold_blocks);
}

double wrapped_degrees(double radians) {
  return std::remainder(radians, 2.0 * std::numbers::pi) * kDegrees;
}

// A figure computed per block, as mean with the standard uncertainty of the mean.
Uncertain mean_of(const std::vector<double>& values) {
  const auto n = static_cast<double>(values.size());
  double sum = 0, squares = 0;
  for (const double v : values) sum += v;
  const double mean = sum / n;
  for (const double v : values) squares += (v - mean) * (v - mean);
  return {mean, std::sqrt(squares / (n - 1.0) / n), n - 1.0};
}

Uncertain in_db(const Uncertain& power) {
  return {10.0 * std::log10(power.value), 0.5 * kDbPerRelative * power.u / power.value, power.dof};
}

// How far a take is from the uncertainty that its plan wants.
struct Integration {
  double longer = 0.0;       // the hold must be so many times as long; <= 1: long enough
  bool floor_bound = false;  // the rig floor alone is too uncertain: no hold would help
};

// What an order under the noise needs cannot be told; twice as long is tried.
void want(Integration& all, const RelativeReading& r, double type_a, Decibels wanted) {
  constexpr double kUnknown = 2.0;
  if (r.flag == Flag::noise) {
    all.longer = std::max(all.longer, kUnknown);
    return;
  }
  // u falls with the square root of the time; the floor's share of it does not.
  const double most = wanted.value() / kDbPerRelative * r.ratio / coverage_factor_95(r.dof);
  const double fixed = r.u * r.u - type_a * type_a;
  if (most * most <= fixed) {
    all.floor_bound = true;
  } else {
    all.longer = std::max(all.longer, type_a * type_a / (most * most - fixed));
  }
}

class SteadyReading {
 public:
  SteadyReading(const TakeSpec& spec, const TakeData& take, const RigView& rig)
      : spec_(spec),
        take_(take),
        rig_(rig),
        rate_(take.response.rate),
        tone_(tone_of(spec, rate_)),
        layout_(layout_of(tone_, spec, rate_)),
        steadied_(in_stimulus_time(take.response, layout_, std::array{tone_.cycles}, rig)),
        spectra_(steadied_.or_else(take.response), layout_, tone_.cycles, steadied_.emptied) {
    for (int b = 0; b < spectra_.blocks(); ++b) {
      turns_.push_back(std::arg(spectra_.at(b, tone_.cycles)));
    }
  }

  TakeVerdict read(Curves& out);

 private:
  void read_floor();
  void read_drive();
  void read_fundamental();
  void state_output(LevelPoint& level);
  double output_u_db(std::initializer_list<double> type_b) const;
  void read_harmonics(Curves& out, LevelPoint& level);
  void read_residual(LevelPoint& level);
  void read_dc(LevelPoint& level);
  HarmonicPoint blank(int order) const;
  void place(HarmonicPoint& point, const RelativeReading& reading, const Line& line) const;

  std::size_t bin(int order) const { return tone_.cycles * static_cast<std::size_t>(order); }
  double turn(int block) const { return turns_[static_cast<std::size_t>(block)]; }
  double transfer_phase() const {
    return turn(first_) - std::arg(rig_.response.loop(tone_.frequency)) +
           2.0 * std::numbers::pi * tone_.frequency.value() * take_.delay / rate_.value();
  }
  bool in_reach(int order) const {
    return order * tone_.frequency.value() < kHighestShare * rig_.usable_rate(rate_).value();
  }
  /// As it left the unit: the return's share of the rig's response is taken out. The blocks are
  /// turned by the fundamental as recorded, so that its own turn within the return is given back.
  Line read_line(int order) const {
    Line l = order == 1 ? spectra_.tone(bin(1), first_)
                        : spectra_.mean(bin(order), first_, [&](int b) { return order * turn(b); });
    const std::complex<double> own = rig_.response.ret(tone_.frequency).response;
    const std::complex<double> share =
        std::abs(own) * ret_ratio(order).response * std::polar(1.0, (1.0 - order) * std::arg(own));
    l.mean /= share;
    l.u /= std::abs(share);
    return steadied_.time.with_loss(l, order * tone_.frequency);
  }
  LoopResponse::Share ret_ratio(int order) const {
    return rig_.response.ret_ratio(order * tone_.frequency, tone_.frequency);
  }
  void read_lines() {
    lines_.push_back(spectra_.mean(0, first_, [](int) { return 0.0; }));
    for (int n = 1; n <= spec_.settings.orders; ++n) {
      lines_.push_back(in_reach(n) ? read_line(n) : Line{});
    }
  }
  const Line& line(int order) const { return lines_[static_cast<std::size_t>(order)]; }

  const TakeSpec& spec_;
  const TakeData& take_;
  const RigView& rig_;
  Hertz rate_;
  CoherentTone tone_;
  HoldLayout layout_;
  SteadiedTake steadied_;
  BlockSpectra spectra_;
  std::vector<double> turns_;  // of the fundamental, by block
  std::vector<Line> lines_;    // by order, the mean first; those in reach
  int first_ = 0;
  Flag take_flag_ = Flag::none;
  Line fundamental_;
  std::vector<double> floor_;  // by order, relative to the fundamental; empty: unknown
  double drive_ = 0.0;         // level at the unit's input, in the rig's unit
  LevelDbfs return_level_;
  double return_u_db_ = 0.0;  // type B: full-scale voltage and the split of the loop's response
  Integration integration_;
};

void SteadyReading::read_drive() {
  const Hertz f = tone_.frequency;
  drive_ = rig_.send.level_of(spec_.send) +
           Decibels::of_ratio(std::abs(rig_.response.send(f).response)).value();
  if (take_.reference == nullptr) return;
  // The reference return carries the drive itself: its level replaces the nominal one.
  const BlockSpectra reference(*take_.reference, layout_, tone_.cycles);
  const Line line = reference.mean(tone_.cycles, first_,
                                   [&](int b) { return std::arg(reference.at(b, tone_.cycles)); });
  drive_ = rig_.ret.level_of_peak(std::abs(line.mean / rig_.response.ret(f).response));
}

void SteadyReading::read_fundamental() {
  fundamental_ = line(1);
  const double peak = std::abs(fundamental_.mean);
  const LoopResponse::Share own = rig_.response.ret(tone_.frequency);
  return_level_ = LevelDbfs(20.0 * std::log10(peak * std::abs(own.response)));
  return_u_db_ = std::hypot(rig_.ret.standard_uncertainty.value(), own.u.value());
}

// Expanded, of the fundamental's level: its scatter, the rig's own share in it, and these.
double SteadyReading::output_u_db(std::initializer_list<double> type_b) const {
  const double own_floor = floor_.empty() ? 0.0 : floor_[1] / std::numbers::sqrt2;
  std::vector<Contribution> parts{
      {kDbPerRelative * fundamental_.u / std::abs(fundamental_.mean), fundamental_.dof},
      {kDbPerRelative * own_floor, kInfiniteDof}};
  for (const double u : type_b) parts.push_back({u, kInfiniteDof});
  const Contribution c = combine(parts);
  return coverage_factor_95(c.dof) * c.u;
}

void SteadyReading::state_output(LevelPoint& level) {
  level.output = rig_.ret.level_of_peak(std::abs(fundamental_.mean));
  level.output_u_db = output_u_db({return_u_db_});
  // Send and return together are what the loop showed: their split does not touch the gain.
  if (rig_.gain_known) {
    level.gain_db = *level.output - drive_;
    level.gain_u_db = output_u_db(
        {rig_.ret.standard_uncertainty.value(), rig_.send.standard_uncertainty.value()});
  }
  // Transfer phase at the block's start, the rig taken out; the stimulus is a cosine of
  // phase 0.
  const double degrees = std::abs(wrapped_degrees(transfer_phase()));
  if (degrees < 60.0) level.polarity = 1.0;
  if (degrees > 120.0) level.polarity = -1.0;
  if (rig_.marker_polarity) level.polarity = *rig_.marker_polarity;
}

// The rig's residual at these converter levels. Orders 2 and 3 bend the response as a whole, so
// they reach every order of it; higher orders are taken as the cable showed them.
void SteadyReading::read_floor() {
  const auto loop = [&](int n) {
    return rig_.floor.at(spec_.send, return_level_, n, tone_.frequency);
  };
  if (!loop(2) || !loop(3)) return;
  std::vector<std::complex<double>> harmonics;
  for (const Line& l : lines_) harmonics.push_back(l.mean);
  for (auto& h : harmonics) h /= std::abs(fundamental_.mean);
  floor_ = curvature_floor(harmonics, *loop(2), *loop(3));
  for (std::size_t n = 4; n < floor_.size(); ++n) {
    floor_[n] += loop(static_cast<int>(n)).value_or(0.0);
  }
}

HarmonicPoint SteadyReading::blank(int order) const {
  HarmonicPoint p;
  p.frequency_hz = tone_.frequency.value();
  p.drive = drive_;
  p.unit = rig_.ret.unit;
  p.order = order;
  p.direction = spec_.down ? "down" : "up";
  return p;
}

void SteadyReading::place(HarmonicPoint& p, const RelativeReading& r, const Line& line) const {
  const double peak = std::abs(fundamental_.mean);
  const double expanded = coverage_factor_95(r.dof) * r.u;
  const std::array flags{take_flag_, r.flag};
  p.flag = gravest(flags);
  if (!(r.ratio > 0.0)) return;  // exactly nothing, as only arithmetic gives it: no level to state
  p.level = rig_.ret.level_of_peak(r.ratio * peak);
  p.relative_db = 20.0 * std::log10(r.ratio);
  const std::array level_parts{Contribution{kDbPerRelative * r.u / r.ratio, r.dof},
                               Contribution{return_u_db_, kInfiniteDof}};
  const Contribution level_u = combine(level_parts);
  p.level_u_db = coverage_factor_95(level_u.dof) * level_u.u;
  if (std::abs(line.mean) > 0.0) p.noise_u_db = kDbPerRelative * line.u / std::abs(line.mean);
  p.noise_dof = line.dof;
  p.in_phase = line.mean.real() * rig_.ret.peak_per_full_scale;
  p.quadrature = line.mean.imag() * rig_.ret.peak_per_full_scale;
  p.component_u = r.u * peak * rig_.ret.peak_per_full_scale;
  p.dof = r.dof;
  if (p.order == 1) {
    p.phase_deg = 0.0;
    const double own_floor = floor_.empty() ? 0.0 : floor_[1] * peak / std::numbers::sqrt2;
    p.component_u = std::hypot(line.u, own_floor) * rig_.ret.peak_per_full_scale;
    p.dof = line.dof;
    p.level_u_db = output_u_db({return_u_db_});
    return;
  }
  p.expanded_u_db = kDbPerRelative * expanded / r.ratio;
  if (r.flag != Flag::noise) {
    p.phase_deg = wrapped_degrees(std::arg(line.mean));
    p.relative_high_db = 20.0 * std::log10(r.ratio + expanded);
    if (r.ratio > expanded) p.relative_low_db = 20.0 * std::log10(r.ratio - expanded);
  } else {
    p.relative_high_db = p.relative_db;
  }
}

void SteadyReading::read_harmonics(Curves& out, LevelPoint& level) {
  const double highest = kHighestShare * rig_.usable_rate(rate_).value();
  std::vector<RelativeReading> summed, even, odd;
  for (int n = 1; n <= spec_.settings.orders; ++n) {
    HarmonicPoint point = blank(n);
    ResponsePoint response{point.frequency_hz, drive_, point.unit, n, {}, {}, {}, Flag::none};
    const double f = n * tone_.frequency.value();
    if (!in_reach(n)) {
      const std::array flags{take_flag_, Flag::alias};
      point.flag = response.flag = gravest(flags);
    } else {
      const Line& l = line(n);
      const double floor = floor_.empty() ? 0.0 : floor_[static_cast<std::size_t>(n)];
      RelativeReading r = relate(std::abs(l.mean), l.u, l.dof, fundamental_, floor);
      r = with_common(r, ret_ratio(n).u.value() / kDbPerRelative);
      if (n == 1) r = {1.0, 0.0, l.dof, Flag::none};
      if (n > 1 && n <= spec_.settings.wanted_orders) {
        want(integration_, r, l.u / std::abs(fundamental_.mean), spec_.settings.wanted_harmonic_u);
      }
      if (floor > 0.0) point.floor_db = 20.0 * std::log10(floor);
      place(point, r, l);
      response.flag = point.flag;
      if (rig_.gain_known && point.level) response.magnitude_db = *point.level - drive_;
      response.phase_deg = point.phase_deg;
      response.expanded_u_db = point.level_u_db;
      if (n == 1) {
        response.phase_deg = wrapped_degrees(transfer_phase());
      } else if (f < std::min(kBandHigh.value(), highest)) {
        summed.push_back(r);
        (n % 2 == 0 ? even : odd).push_back(r);
        level.thd_orders = n;
      }
    }
    out.harmonics.push_back(point);
    if (!spec_.down) out.responses.push_back(response);  // the table has no direction
  }
  if (summed.empty()) return;
  const RelativeReading thd = root_sum_of(summed);
  const double d = thd.ratio;
  if (!(d > 0.0)) return;
  const double expanded = coverage_factor_95(thd.dof) * thd.u;
  const double to_r = 1.0 / std::sqrt(1.0 + d * d);  // THD_R = THD_F / sqrt(1 + THD_F^2)
  level.thd_f_percent = 100.0 * d;
  level.thd_f_u_percent = 100.0 * expanded;
  level.thd_r_percent = 100.0 * d * to_r;
  level.thd_r_u_percent = 100.0 * expanded * to_r * to_r * to_r;
  const std::array flags{level.flag, thd.flag};
  level.flag = gravest(flags);
  if (even.empty() || odd.empty()) return;
  const RelativeReading e = root_sum_of(even), o = root_sum_of(odd);
  if (e.flag == Flag::noise || o.flag == Flag::noise) return;
  if (!(e.ratio > 0.0) || !(o.ratio > 0.0)) return;
  level.even_odd_db = 20.0 * std::log10(e.ratio / o.ratio);
  const std::array parts{Contribution{kDbPerRelative * e.u / e.ratio, e.dof},
                         Contribution{kDbPerRelative * o.u / o.ratio, o.dof}};
  const Contribution c = combine(parts);
  level.even_odd_u_db = coverage_factor_95(c.dof) * c.u;
}

void SteadyReading::read_residual(LevelPoint& level) {
  const double width = spectra_.bin_width();
  const auto low = static_cast<std::size_t>(std::ceil(kBandLow.value() / width - 1e-9));
  const auto high = static_cast<std::size_t>(std::floor(
      std::min(kBandHigh.value(), kHighestShare * rig_.usable_rate(rate_).value()) / width + 1e-9));
  if (tone_.cycles < low || tone_.cycles > high) return;
  std::vector<double> residual, ratio, sinad, noise;
  for (int b = first_; b < spectra_.blocks(); ++b) {
    const double fundamental = spectra_.band_power(b, tone_.cycles, tone_.cycles);
    // Summed, never subtracted from the whole: the difference of two nearly equal sums may be
    // negative.
    double harmonics = 0.0, between = spectra_.band_power(b, low, tone_.cycles - 1);
    for (std::size_t k = tone_.cycles; k <= high; k += tone_.cycles) {
      if (k > tone_.cycles) harmonics += spectra_.band_power(b, k, k);
      between += spectra_.band_power(b, k + 1, std::min(high, k + tone_.cycles - 1));
    }
    const double rest = harmonics + between;
    ratio.push_back(rest / (fundamental + rest));
    sinad.push_back(fundamental / rest);
    noise.push_back(between);
  }
  const Uncertain r = mean_of(ratio);
  if (!(r.value > 0.0)) return;  // a take without any residual: arithmetic, not a measurement
  level.thdn_percent = 100.0 * std::sqrt(r.value);
  level.thdn_u_percent = 100.0 * coverage_factor_95(r.dof) * 0.5 * r.u / std::sqrt(r.value);
  const Uncertain s = in_db(mean_of(sinad));
  level.sinad_db = s.value;
  level.sinad_u_db = expanded_95(s);
  const Uncertain n = mean_of(noise);
  if (n.value > 0.0) {
    const Uncertain db = in_db(n);
    // Mean square to the level of a sine of that rms.
    level.noise = db.value + 20.0 * std::log10(std::numbers::sqrt2) + rig_.ret.offset_db;
    level.noise_u_db = std::hypot(
        expanded_95(db), coverage_factor_95(db.dof) * rig_.ret.standard_uncertainty.value());
  }
}

void SteadyReading::read_dc(LevelPoint& level) {
  if (!rig_.sees_dc) return;
  const Line& dc = line(0);
  level.dc = dc.mean.real() * rig_.ret.peak_per_full_scale;
  // The mean has one component, not two: its own scatter is sqrt 2 of what a line's component
  // shows.
  level.dc_u =
      coverage_factor_95(dc.dof) * std::numbers::sqrt2 * dc.u * rig_.ret.peak_per_full_scale;
}

TakeVerdict SteadyReading::read(Curves& out) {
  const double highest = kHighestShare * rig_.usable_rate(rate_).value();
  std::vector<std::size_t> watched;
  for (int n = 1; n <= 3 && n * tone_.frequency.value() < highest; ++n) watched.push_back(bin(n));
  const Seconds block(static_cast<double>(layout_.block) / rate_.value());
  const Settled settled = judge_settling(spectra_, watched, spec_.settings, block);
  first_ = settled.first;

  LevelPoint level;
  TakeVerdict verdict;
  verdict.settled = settled.settled;
  verdict.settling = first_ * block;
  verdict.clipped = reaches_full_scale(take_.response, layout_);
  if (!settled.settled) take_flag_ = Flag::unsteady;
  if (verdict.clipped) take_flag_ = Flag::clipped;
  level.flag = take_flag_;

  read_drive();
  level.frequency_hz = tone_.frequency.value();
  level.asked_hz = spec_.asked.value();
  level.drive = drive_;
  level.unit = rig_.ret.unit;
  level.direction = spec_.down ? "down" : "up";
  level.blocks = spectra_.blocks() - first_;
  level.settled_after_s = first_ * block.value();
  if (std::abs(spectra_.at(first_, tone_.cycles)) <= 0.0) {
    // Digital silence: there is no fundamental to refer anything to.
    level.flag = Flag::noise;
    out.levels.push_back(level);
    return verdict;
  }
  read_lines();
  read_fundamental();
  if (!serves_as_reference(fundamental_, level.blocks)) {
    level.flag = Flag::noise;
    out.levels.push_back(level);
    return verdict;
  }
  read_floor();
  state_output(level);
  read_harmonics(out, level);
  if (spec_.settings.wanted_harmonic_u.value() > 0.0) {
    verdict.longer = integration_.longer;
    level.integration = integration_.longer > 1.0  ? "time-spent"
                        : integration_.floor_bound ? "floor"
                                                   : "reached";
  }
  read_residual(level);
  read_dc(level);
  out.levels.push_back(level);
  if (level.flag != Flag::noise) verdict.thd_f_percent = level.thd_f_percent;
  verdict.output_level = level.output;
  return verdict;
}

TakeVerdict read(const TakeSpec& spec, const TakeData& take, const RigView& rig, Curves& out) {
  return SteadyReading(spec, take, rig).read(out);
}

}  // namespace

Hertz steady_frequency(const TakeSpec& spec, Hertz rate) { return tone_of(spec, rate).frequency; }

Method steady_sine() {
  return {"steady",
          "steady sine",
          "AES17-2015; IEEE Std 1057-2017",
          Placement::every_rung,
          {.id = "steady", .frequencies = true},
          first_hold_blocks,
          block_length,
          stimulus,
          read,
          nullptr,
          nullptr,
          length};
}

}  // namespace kneeprint
