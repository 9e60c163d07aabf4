// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/two_tone.h"

#include <algorithm>
#include <cmath>
#include <numeric>

#include "method/coherent.h"
#include "method/hold.h"

namespace kneeprint {
namespace {

constexpr int kTailBlocks = 1;

std::size_t block_of(const TonePair& pair, const TakeSpec& spec, Hertz rate) {
  const std::array tones{pair.f1, pair.f2};
  return common_block(tones, rate, spec.settings.block);
}

std::size_t cycles_in(Hertz f, std::size_t block, Hertz rate) {
  return static_cast<std::size_t>(
      std::llround(f.value() * static_cast<double>(block) / rate.value()));
}

HoldLayout hold_of(const TonePair& pair, const TakeSpec& spec, Hertz rate) {
  return held_layout(std::min(pair.f1, pair.f2), rate, block_of(pair, spec, rate),
                     spec.hold_blocks);
}

HoldLayout tail_of(const TonePair& pair, const TakeSpec& spec, Hertz rate) {
  if (!pair.f2_alone) return {};
  return tail_layout(std::min(pair.f1, pair.f2), rate, block_of(pair, spec, rate), spec.hold_blocks,
                     kTailBlocks);
}

HeldStimulus held(const TonePair& pair, const TakeSpec& spec, Hertz rate) {
  const double peak = sine_peak(spec.send);
  const std::array tones{Tone{pair.f1, pair.share1 * peak}, Tone{pair.f2, pair.share2 * peak}};
  const std::array alone{tones[1]};
  return held_tones(tones, rate, block_of(pair, spec, rate), spec.hold_blocks, alone,
                    pair.f2_alone ? kTailBlocks : 0);
}

}  // namespace

Seconds two_tone_block_length(const TonePair& pair, const TakeSpec& spec, Hertz rate) {
  return Seconds(static_cast<double>(block_of(pair, spec, rate)) / rate.value());
}

int two_tone_first_hold_blocks(const TonePair& pair, const TakeSpec& spec, Hertz rate) {
  return kept_blocks(spec.settings, two_tone_block_length(pair, spec, rate)) + 1;
}

std::size_t two_tone_length(const TonePair& pair, const TakeSpec& spec, Hertz rate) {
  return held_length(std::min(pair.f1, pair.f2), rate, block_of(pair, spec, rate), spec.hold_blocks,
                     pair.f2_alone ? kTailBlocks : 0);
}

Stimulus two_tone_stimulus(const TonePair& pair, const TakeSpec& spec, Hertz rate) {
  HeldStimulus h = held(pair, spec, rate);
  return {std::move(h.wave), h.hold, std::min(pair.f1, pair.f2)};
}

TwoToneReading::TwoToneReading(const TonePair& pair, const TakeSpec& spec, const TakeData& take,
                               const RigView& rig)
    : pair_(pair),
      rig_(rig),
      rate_(take.response.rate),
      hold_(hold_of(pair, spec, rate_)),
      tail_(tail_of(pair, spec, rate_)),
      cycles1_(cycles_in(pair.f1, hold_.block, rate_)),
      cycles2_(cycles_in(pair.f2, hold_.block, rate_)),
      spectra_(take.response, hold_, std::gcd(cycles1_, cycles2_)) {
  if (tail_.blocks > 0) alone_spectra_.emplace(take.response, tail_, std::gcd(cycles1_, cycles2_));
  std::vector<std::size_t> watched;
  for (const ProductIndex p : {ProductIndex{1, 0}, {0, 1}, {1, 1}, {-1, 1}}) {
    if (in_reach(p)) watched.push_back(bin(p));
  }
  const Settled settled = judge_settling(spectra_, watched, spec.settings,
                                         Seconds(static_cast<double>(hold_.block) / rate_.value()));
  first_ = settled.first;
  verdict_.settled = settled.settled;
  verdict_.clipped = reaches_full_scale(take.response, hold_);
  if (!settled.settled) take_flag_ = Flag::unsteady;
  if (verdict_.clipped) take_flag_ = Flag::clipped;

  tone1_ = product({1, 0});
  tone2_ = product({0, 1});
  const auto present = [](const Line& l) {
    constexpr double kLeastOverNoise =
        5.0;  // as for a steady sine: below, no reference for anything
    return std::abs(l.mean) > kLeastOverNoise * l.u;
  };
  has_tones_ = present(tone1_) && present(tone2_);
  // The return's converter sees the sum of both tones' peaks.
  if (has_tones_) {
    return_level_ = LevelDbfs(20.0 * std::log10(std::abs(tone1_.mean) + std::abs(tone2_.mean)));
  }
  drive_ = rig.send.level_of(spec.send);
  if (take.reference != nullptr) {
    const BlockSpectra reference(*take.reference, hold_, std::gcd(cycles1_, cycles2_));
    double peak = 0.0;
    for (const std::size_t k : {cycles1_, cycles2_}) {
      peak += std::abs(
          reference.mean(k, first_, [&](int b) { return std::arg(reference.at(b, k)); }).mean);
    }
    drive_ = rig.ret.level_of_peak(peak);
  }
}

Hertz TwoToneReading::frequency(ProductIndex p) const {
  return Hertz(std::abs(p.k1 * pair_.f1.value() + p.k2 * pair_.f2.value()));
}

std::size_t TwoToneReading::bin(ProductIndex p) const {
  return static_cast<std::size_t>(
      std::abs(p.k1 * static_cast<long>(cycles1_) + p.k2 * static_cast<long>(cycles2_)));
}

bool TwoToneReading::in_reach(ProductIndex p) const {
  // Two-tone methods put tones up to 20 kHz and products just above: what the converter's own
  // filter passes (0.4535 of the rate in the usual half-band design) can be read.
  constexpr double kConverterShare = 0.4535;
  return frequency(p).value() <= kConverterShare * rig_.usable_rate(rate_).value();
}

double TwoToneReading::turn(ProductIndex p, int block) const {
  const double turned =
      p.k1 * std::arg(spectra_.at(block, cycles1_)) + p.k2 * std::arg(spectra_.at(block, cycles2_));
  // A product at a negative frequency shows as the conjugate at the positive one.
  return p.k1 * pair_.f1.value() + p.k2 * pair_.f2.value() < 0.0 ? -turned : turned;
}

Line TwoToneReading::product(ProductIndex p) const {
  return spectra_.mean(bin(p), first_, [&](int b) { return turn(p, b); });
}

std::optional<double> TwoToneReading::alone(ProductIndex p) const {
  if (!alone_spectra_) return std::nullopt;
  return std::abs(alone_spectra_->at(0, bin(p)));
}

IntermodPoint TwoToneReading::blank(const std::string& name) const {
  IntermodPoint p;
  p.method = pair_.method;
  p.f1_hz = pair_.f1.value();
  p.f2_hz = pair_.f2.value();
  p.drive = drive_;
  p.unit = rig_.ret.unit;
  p.product = name;
  p.blocks = spectra_.blocks() - first_;
  p.settled_after_s = first_ * static_cast<double>(hold_.block) / rate_.value();
  return p;
}

TwoToneReading::Sum TwoToneReading::finish(const std::string& name, const Part& part,
                                           const Line& carrier, double rig_floor) const {
  Sum s;
  s.point = blank(name);
  if (!part.in_reach) {
    const std::array flags{take_flag_, Flag::alias};
    s.point.flag = gravest(flags);
    s.reading.flag = Flag::alias;
    return s;
  }
  s.reading = relate(part.amplitude, part.u, part.dof, carrier, rig_floor);
  // What stands there with f2 alone is not the unit's intermodulation: products less than 10 dB
  // above it are flagged. Where the segment shows noise alone, the noise flag has spoken already.
  constexpr double kTenDecibels = 3.1622776601683795;
  if (s.reading.flag == Flag::none && part.alone && *part.alone * kTenDecibels > part.amplitude) {
    s.reading.flag = Flag::floor;
  }
  const std::array flags{take_flag_, s.reading.flag};
  s.point.flag = gravest(flags);
  if (!(s.reading.ratio > 0.0)) return s;  // exactly nothing, as only arithmetic gives it
  const double expanded = coverage_factor_95(s.reading.dof) * s.reading.u;
  s.point.percent = 100.0 * s.reading.ratio;
  s.point.db = 20.0 * std::log10(s.reading.ratio);
  s.point.expanded_u_db = kDbPerRelative * expanded / s.reading.ratio;
  const double floor = std::max(rig_floor, part.alone.value_or(0.0) / std::abs(carrier.mean));
  if (floor > 0.0) s.point.floor_db = 20.0 * std::log10(floor);
  return s;
}

TwoToneReading::Sum TwoToneReading::sum(const std::string& name, std::array<ProductIndex, 2> pair,
                                        const Line& carrier, double rig_floor) const {
  const Line a = product(pair[0]), b = product(pair[1]);
  const std::array parts{Contribution{a.u, a.dof}, Contribution{b.u, b.dof}};
  const Contribution c = combine(parts);
  Part part{std::abs(a.mean) + std::abs(b.mean), c.u, c.dof, std::nullopt,
            in_reach(pair[0]) && in_reach(pair[1])};
  const auto alone_a = alone(pair[0]), alone_b = alone(pair[1]);
  if (alone_a && alone_b) part.alone = *alone_a + *alone_b;
  return finish(name, part, carrier, rig_floor);
}

TwoToneReading::Sum TwoToneReading::single(const std::string& name, ProductIndex p,
                                           const Line& carrier, double rig_floor) const {
  const Line a = product(p);
  return finish(name, {std::abs(a.mean), a.u, a.dof, alone(p), in_reach(p)}, carrier, rig_floor);
}

IntermodPoint TwoToneReading::total(const Sum& a, const Sum& b) const {
  IntermodPoint p = blank("total");
  std::vector<RelativeReading> seen, limits;
  for (const Sum* s : {&a, &b}) {
    if (s->reading.flag == Flag::alias) continue;
    (s->reading.flag == Flag::noise ? limits : seen).push_back(s->reading);
  }
  const std::vector<RelativeReading>& used = seen.empty() ? limits : seen;
  if (used.empty()) {
    p.flag = a.point.flag;
    return p;
  }
  double squares = 0.0;
  for (const auto& r : used) squares += r.ratio * r.ratio;
  const double root = std::sqrt(squares);
  if (root == 0.0) {
    p.flag = a.point.flag;
    return p;
  }
  std::vector<Contribution> terms;
  for (const auto& r : used) terms.push_back({r.ratio * r.u / root, r.dof});
  if (!seen.empty()) {
    // A part that is only an upper limit widens the uncertainty: rectangular between absent and
    // full.
    for (const auto& r : limits) {
      terms.push_back({(std::hypot(root, r.ratio) - root) / (2.0 * std::sqrt(3.0)), kInfiniteDof});
    }
  }
  const Contribution c = combine(terms);
  p.percent = 100.0 * root;
  p.db = 20.0 * std::log10(root);
  p.expanded_u_db = kDbPerRelative * coverage_factor_95(c.dof) * c.u / root;
  if (a.point.floor_db && b.point.floor_db) {
    p.floor_db = 10.0 * std::log10(std::pow(10.0, *a.point.floor_db / 10.0) +
                                   std::pow(10.0, *b.point.floor_db / 10.0));
  }
  // A missing part (beyond the sample rate) makes the total incomplete: it carries that flag.
  const bool incomplete = a.reading.flag == Flag::alias || b.reading.flag == Flag::alias;
  const bool all_floor =
      std::all_of(used.begin(), used.end(), [](const auto& r) { return r.flag == Flag::floor; });
  const std::array flags{take_flag_, incomplete ? Flag::alias : Flag::none,
                         seen.empty() ? Flag::noise : Flag::none,
                         all_floor ? Flag::floor : Flag::none};
  p.flag = gravest(flags);
  return p;
}

}  // namespace kneeprint
