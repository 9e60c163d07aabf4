// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/two_tone.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>
#include <numeric>

#include "quantity/failure.h"

namespace kneeprint {
namespace {

constexpr int kTailBlocks = 1;
constexpr int kHighestOrder = 5;  // of the products listed
constexpr double kDegrees = 180.0 / std::numbers::pi;
constexpr double kTenDecibels = 3.1622776601683795;

// What the sum, and the root sum of squares, of two amplitudes of noise alone exceed in 5 % of
// cases, over the root sum of their standard uncertainties (taken as equal): F(s) = 1 - exp(-s^2/2)
// - sqrt(pi)/2 s exp(-s^2/4) erf(s/2) for the sum of two unit Rayleigh variates (convolution of
// their densities) is 0.95 at s = 4.146052; chi of four degrees of freedom has it at 3.080216; both
// over sqrt 2.
constexpr double kNoiseSum95 = 2.931701830;
constexpr double kNoiseRootSum95 = 2.178041441;

CoherentPair coherent(const TonePair& pair, const TakeSpec& spec, Hertz rate) {
  return coherent_pair(pair.f1, pair.f2, rate, spec.settings.block);
}

HoldLayout hold_of(const CoherentPair& played, const TakeSpec& spec, Hertz rate) {
  return held_layout(played.f1, rate, played.block, spec.hold_blocks);
}

HoldLayout tail_of(const TonePair& pair, const CoherentPair& played, const TakeSpec& spec,
                   Hertz rate) {
  if (!pair.f2_alone) return {};
  return tail_layout(played.f1, rate, played.block, spec.hold_blocks, kTailBlocks);
}

HeldStimulus held(const TonePair& pair, const TakeSpec& spec, Hertz rate) {
  const CoherentPair played = coherent(pair, spec, rate);
  const double peak = sine_peak(spec.send);
  const std::array tones{Tone{played.f1, pair.share1() * peak},
                         Tone{played.f2, pair.share2() * peak}};
  const std::array alone{tones[1]};
  return held_tones(tones, rate, played.block, spec.hold_blocks, alone,
                    pair.f2_alone ? kTailBlocks : 0);
}

// Lines at multiples of `stride` bins of the first block, as peak amplitudes (line 0 twice its
// mean). Its periods are summed first: so short a transform costs a tenth of the block's, and the
// bins between are not asked for.
std::vector<std::complex<double>> folded_lines(const Waveform& take, const HoldLayout& hold,
                                               std::size_t stride) {
  const std::size_t period = hold.block / stride;
  std::vector<double> sum(period, 0.0);
  for (std::size_t k = 0; k < stride; ++k) {
    const double* from = take.samples.data() + hold.first_block + k * period;
    for (std::size_t n = 0; n < period; ++n) sum[n] += from[n];
  }
  std::vector<std::complex<double>> lines = forward_fft(sum);
  for (auto& z : lines) z *= 2.0 / static_cast<double>(hold.block);
  return lines;
}

}  // namespace

// One product, or several taken together.
struct TwoToneReading::Part {
  double read = 0.0;       // as it stands in the spectrum
  double amplitude = 0.0;  // what noise adds taken off
  double u = 0.0, dof = kInfiniteDof;
  double noise_threshold = 0.0;  // at most this: noise
  double limit = 0.0;            // 95 % upper limit of the amplitude
  double split_u = 0.0;          // relative, from the unknown split of the rig's response
  double floor = 0.0;            // the rig's, relative to the reference; 0: unknown
  std::optional<double> alone;   // with f2 alone
  bool in_reach = true;
  bool readable = true;
};

TonePair with_options(TonePair pair, const StepOptions& options) {
  if (options.tones.size() == 2) {
    pair.as_named &= options.tones[0] == pair.f1 && options.tones[1] == pair.f2;
    pair.f1 = options.tones[0];
    pair.f2 = options.tones[1];
  }
  if (options.ratio) {
    pair.as_named &= *options.ratio == pair.ratio;
    pair.ratio = *options.ratio;
  }
  return pair;
}

Seconds two_tone_block_length(const TonePair& pair, const TakeSpec& spec, Hertz rate) {
  return Seconds(static_cast<double>(coherent(pair, spec, rate).block) / rate.value());
}

int two_tone_first_hold_blocks(const TonePair& pair, const TakeSpec& spec, Hertz rate) {
  return kept_blocks(spec.settings, two_tone_block_length(pair, spec, rate)) + 1;
}

std::size_t two_tone_length(const TonePair& pair, const TakeSpec& spec, Hertz rate) {
  const CoherentPair played = coherent(pair, spec, rate);
  return held_length(played.f1, rate, played.block, spec.hold_blocks,
                     pair.f2_alone ? kTailBlocks : 0);
}

Stimulus two_tone_stimulus(const TonePair& pair, const TakeSpec& spec, Hertz rate) {
  HeldStimulus h = held(pair, spec, rate);
  const std::size_t read = h.hold.block * static_cast<std::size_t>(h.hold.blocks + h.tail.blocks);
  return {std::move(h.wave), h.hold, pair.f1, read};
}

void check_pair(const TonePair& pair, Hertz rate) {
  const double top = kConverterShare * rate.value();
  if (pair.f2.value() > top * (1.0 + 1e-9)) {
    throw InputError(
        fmt::format("plan: method \"{}\" plays {} Hz, which a sample rate of {} Hz does not carry "
                    "(at most {:.0f} Hz): lower the tone or raise the rate",
                    pair.method, pair.f2.value(), rate.value(), top));
  }
  coherent_pair(pair.f1, pair.f2, rate, TakeSettings{}.block);
}

TwoToneReading::TwoToneReading(const TonePair& pair, const TakeSpec& spec, const TakeData& take,
                               const RigView& rig)
    : pair_(pair),
      rig_(rig),
      send_(spec.send),
      rate_(take.response.rate),
      tones_(coherent(pair, spec, rate_)),
      hold_(hold_of(tones_, spec, rate_)),
      tail_(tail_of(pair, tones_, spec, rate_)),
      lines_(take.response, hold_, tones_, rig),
      products_(products_to_order(kHighestOrder, tones_.cycles1, tones_.cycles2)) {
  if (tail_.blocks > 0) {
    const SteadiedTake alone =
        in_stimulus_time(take.response, tail_, std::array{tones_.cycles2}, rig);
    alone_ = folded_lines(alone.or_else(take.response), tail_, alone_stride());
  }
  std::vector<std::size_t> watched;
  for (const ProductIndex p : {ProductIndex{1, 0}, {0, 1}, {1, 1}, {-1, 1}}) {
    if (lines_.in_reach(p)) watched.push_back(lines_.bin(p));
  }
  const Settled settled = judge_settling(lines_.spectra(), watched, spec.settings,
                                         Seconds(static_cast<double>(hold_.block) / rate_.value()));
  first_ = settled.first;
  verdict_.settled = settled.settled;
  verdict_.settling = first_ * Seconds(static_cast<double>(hold_.block) / rate_.value());
  verdict_.clipped = reaches_full_scale(take.response, hold_);
  if (!settled.settled) take_flag_ = Flag::unsteady;
  if (verdict_.clipped) take_flag_ = Flag::clipped;

  tone1_ = product({1, 0});
  tone2_ = product({0, 1});
  const int averaged = lines_.spectra().blocks() - first_;
  has_tones_ = serves_as_reference(tone1_, averaged) && serves_as_reference(tone2_, averaged);
  const auto own = [&](Hertz f) { return std::abs(rig.response.ret(f).response); };
  // The return's converter sees the sum of both tones' peaks.
  if (has_tones_) {
    return_level_ = LevelDbfs(20.0 * std::log10(std::abs(tone1_.mean) * own(tones_.f1) +
                                                std::abs(tone2_.mean) * own(tones_.f2)));
  }
  const double sent = pair.share1() * std::abs(rig.response.send(tones_.f1).response) +
                      pair.share2() * std::abs(rig.response.send(tones_.f2).response);
  drive_ = rig.send.level_of(spec.send) + Decibels::of_ratio(sent).value();
  if (take.reference != nullptr) {
    const ToneLines reference(*take.reference, hold_, tones_, rig);
    drive_ = rig.ret.level_of_peak(std::abs(reference.product({1, 0}, first_).mean) +
                                   std::abs(reference.product({0, 1}, first_).mean));
  }
}

const Line& TwoToneReading::product(ProductIndex p) const {
  const auto known = read_.find(p);
  return known != read_.end() ? known->second
                              : read_.emplace(p, lines_.product(p, first_)).first->second;
}

// All products stand on multiples of so many bins.
std::size_t TwoToneReading::alone_stride() const {
  return std::gcd(std::gcd(tones_.cycles1, tones_.cycles2), tones_.block);
}

std::optional<double> TwoToneReading::alone(ProductIndex p) const {
  if (alone_.empty()) return std::nullopt;
  return std::abs(alone_[lines_.bin(p) / alone_stride()] /
                  rig_.response.ret(lines_.frequency(p)).response);
}

// The other products of that frequency, as a note; "" for none.
std::string TwoToneReading::falls_on(ProductIndex p) const {
  if (lines_.bin(p) == 0) return "falls on dc";
  std::string note;
  for (const ProductIndex q : products_) {
    if (q == p || ProductIndex{-q.k1, -q.k2} == p || lines_.bin(q) != lines_.bin(p)) continue;
    note += (note.empty() ? "falls on " : " and ") + name_of(q);
  }
  return note;
}

TwoToneReading::Reference TwoToneReading::upper_tone() const {
  return {tone2_, pair_.share2(), false};
}

TwoToneReading::Reference TwoToneReading::both_tones() const {
  const std::array parts{Contribution{tone1_.u, tone1_.dof}, Contribution{tone2_.u, tone2_.dof}};
  const Contribution c = combine(parts);
  return {{std::abs(tone1_.mean) + std::abs(tone2_.mean), c.u, c.dof}, 1.0, true};
}

// The rig's own product for a rig that bends weakly, from the harmonic that it shows at these
// levels.
double TwoToneReading::rig_floor(ProductIndex p, const Reference& reference) const {
  if (p.order() < 2) return 0.0;
  auto floor = floors_.find(p.order());
  if (floor == floors_.end()) {
    const auto at_order = rig_.floor.at(send_, return_level_, p.order());
    floor = floors_.emplace(p.order(), at_order.value_or(0.0)).first;
  }
  return floor->second * over_harmonic(p, pair_.share1(), pair_.share2()) / reference.share;
}

IntermodPoint TwoToneReading::blank(const std::string& name) const {
  IntermodPoint p;
  p.method = pair_.method;
  p.f1_hz = tones_.f1.value();
  p.f2_hz = tones_.f2.value();
  p.ratio = pair_.ratio;
  p.drive = drive_;
  p.unit = rig_.ret.unit;
  p.product = name;
  p.blocks = lines_.spectra().blocks() - first_;
  p.settled_after_s = first_ * static_cast<double>(hold_.block) / rate_.value();
  return p;
}

TwoToneReading::Part TwoToneReading::single(ProductIndex p, const Reference& reference) const {
  Part part;
  part.in_reach = lines_.in_reach(p);
  part.readable = falls_on(p).empty();
  if (!part.in_reach || lines_.bin(p) == 0) return part;
  const Line l = product(p);
  part.read = std::abs(l.mean);
  part.amplitude = without_noise(part.read, l.u);
  part.u = l.u;
  part.dof = l.dof;
  part.noise_threshold = noise_threshold(l.u);
  part.limit = amplitude_upper_limit(part.read, l.u);
  part.split_u = lines_.split_u(p);
  part.floor = rig_floor(p, reference);
  if (p.k1 != 0) part.alone = alone(p);  // harmonics of f2 need no f1
  return part;
}

RelativeReading TwoToneReading::relative(const Part& part, const Reference& reference) const {
  const bool in_noise = part.read <= part.noise_threshold;
  RelativeReading r = relate(Amplitude{part.amplitude, part.u, part.dof, in_noise, part.limit},
                             reference.line, part.floor);
  // What stands there with f2 alone is not the unit's intermodulation: products less than 10 dB
  // above it are flagged. Where the segment shows noise alone, the noise flag has spoken already.
  if (r.flag == Flag::none && part.alone && *part.alone * kTenDecibels > part.read) {
    r.flag = Flag::floor;
  }
  return with_common(r, part.split_u);
}

TwoToneReading::Row TwoToneReading::finish(const std::string& name, const Part& part,
                                           const Reference& reference) const {
  Row row;
  row.point = blank(name);
  row.point.flag = take_flag_;
  row.readable = part.readable;
  if (!part.in_reach) {
    const std::array flags{take_flag_, Flag::alias};
    row.point.flag = gravest(flags);
    row.reading.flag = Flag::alias;
    return row;
  }
  if (!part.readable) return row;
  Part bounded = part;
  if (pair_.as_named) {
    if (const auto measured = rig_.floor.at_product(send_, return_level_, pair_.method, name)) {
      bounded.floor = *measured;
    }
  }
  row.reading = relative(bounded, reference);
  const std::array flags{take_flag_, row.reading.flag};
  row.point.flag = gravest(flags);
  if (!(row.reading.ratio > 0.0)) return row;  // exactly nothing, as only arithmetic gives it
  const double expanded = coverage_factor_95(row.reading.dof) * row.reading.u;
  row.point.percent = 100.0 * row.reading.ratio;
  row.point.db = 20.0 * std::log10(row.reading.ratio);
  row.point.expanded_u_db = kDbPerRelative * expanded / row.reading.ratio;
  const double floor =
      std::max(bounded.floor, part.alone.value_or(0.0) / std::abs(reference.line.mean));
  if (floor > 0.0) row.point.floor_db = 20.0 * std::log10(floor);
  return row;
}

TwoToneReading::Row TwoToneReading::arithmetic_sum(const std::string& name,
                                                   std::span<const ProductIndex> products,
                                                   const Reference& reference) const {
  if (products.size() == 1) return finish(name, single(products[0], reference), reference);
  Part all;
  std::vector<Contribution> terms;
  for (const ProductIndex p : products) {
    const Part part = single(p, reference);
    all.in_reach &= part.in_reach;
    all.readable &= part.readable;
    all.read += part.read;
    all.amplitude += part.amplitude;
    all.limit += part.limit;
    all.floor += part.floor;
    all.split_u += part.amplitude * part.split_u;
    if (part.alone) all.alone = all.alone.value_or(0.0) + *part.alone;
    terms.push_back({part.u, part.dof});
  }
  const Contribution c = combine(terms);
  all.u = c.u;
  all.dof = c.dof;
  if (all.amplitude > 0.0) all.split_u /= all.amplitude;
  all.noise_threshold = kNoiseSum95 * c.u;
  return finish(name, all, reference);
}

TwoToneReading::Row TwoToneReading::root_sum(const std::string& name,
                                             std::span<const ProductIndex> products,
                                             const Reference& reference) const {
  Part all;
  std::vector<Part> parts;
  for (const ProductIndex p : products) {
    const Part& part = parts.emplace_back(single(p, reference));
    all.in_reach &= part.in_reach;
    all.readable &= part.readable;
    all.read = std::hypot(all.read, part.read);
    all.amplitude = std::hypot(all.amplitude, part.amplitude);
    all.limit = std::hypot(all.limit, part.limit);
    all.floor = std::hypot(all.floor, part.floor);
    if (part.alone) all.alone = std::hypot(all.alone.value_or(0.0), *part.alone);
  }
  std::vector<Contribution> terms;
  double all_u = 0.0;
  for (const Part& part : parts) {
    // d r / d a = a / r (JCGM 100:2008 eq. 10).
    const double weight = all.amplitude > 0.0 ? part.amplitude / all.amplitude : 1.0;
    terms.push_back({weight * part.u, part.dof});
    all.split_u += weight * weight * part.split_u;
    all_u = std::hypot(all_u, part.u);
  }
  const Contribution c = combine(terms);
  all.u = c.u;
  all.dof = c.dof;
  all.noise_threshold = kNoiseRootSum95 * all_u;
  return finish(name, all, reference);
}

IntermodPoint TwoToneReading::total(const std::string& name, const Row& a, const Row& b) const {
  IntermodPoint p = blank(name);
  p.flag = take_flag_;
  if (!a.readable || !b.readable) return p;
  std::vector<RelativeReading> parts;
  for (const Row* row : {&a, &b}) {
    if (row->reading.flag != Flag::alias) parts.push_back(row->reading);
  }
  // A missing part (beyond the sample rate) makes the total incomplete: it carries that flag.
  const RelativeReading r = root_sum_of(parts);
  const std::array flags{take_flag_, parts.size() < 2 ? Flag::alias : Flag::none, r.flag};
  p.flag = gravest(flags);
  if (!(r.ratio > 0.0)) return p;
  p.percent = 100.0 * r.ratio;
  p.db = 20.0 * std::log10(r.ratio);
  p.expanded_u_db = kDbPerRelative * coverage_factor_95(r.dof) * r.u / r.ratio;
  if (a.point.floor_db && b.point.floor_db) {
    p.floor_db = 10.0 * std::log10(std::pow(10.0, *a.point.floor_db / 10.0) +
                                   std::pow(10.0, *b.point.floor_db / 10.0));
  }
  return p;
}

// A tone over a reference that holds it: with r = a / (a + b), u(r) / (r (1 - r)) is the root sum
// of both relative uncertainties.
RelativeReading TwoToneReading::relative_tone(ProductIndex p, const Reference& reference) const {
  const Line& own = p.k1 != 0 ? tone1_ : tone2_;
  const double r = std::abs(own.mean) / std::abs(reference.line.mean);
  if (!reference.both) {
    if (p.k1 != 0) return relate(std::abs(own.mean), own.u, own.dof, reference.line, 0.0);
    return {1.0, 0.0, kInfiniteDof, Flag::none};
  }
  const auto weighted = [&](const Line& l) {
    return Contribution{r * (1.0 - r) * l.u / std::abs(l.mean), l.dof};
  };
  const std::array parts{weighted(tone1_), weighted(tone2_)};
  const Contribution c = combine(parts);
  return {r, c.u, c.dof, Flag::none};
}

ProductPoint TwoToneReading::listed(ProductIndex p, const Reference& reference) const {
  ProductPoint point;
  point.method = pair_.method;
  point.f1_hz = tones_.f1.value();
  point.f2_hz = tones_.f2.value();
  point.drive = drive_;
  point.unit = rig_.ret.unit;
  point.k1 = p.k1;
  point.k2 = p.k2;
  point.order = p.order();
  point.frequency_hz = lines_.frequency(p).value();
  point.flag = take_flag_;
  if (!lines_.in_reach(p)) {
    const std::array flags{take_flag_, Flag::alias};
    point.flag = gravest(flags);
    point.note = "past the highest frequency shown";
    return point;
  }
  if (const std::string note = falls_on(p); !note.empty()) point.note = note;
  if (lines_.bin(p) == 0) return point;
  const bool is_tone = p.order() == 1;
  const RelativeReading r =
      is_tone ? relative_tone(p, reference) : relative(single(p, reference), reference);
  const std::array flags{take_flag_, r.flag};
  point.flag = gravest(flags);
  if (!(r.ratio > 0.0)) return point;
  point.level = rig_.ret.level_of_peak(r.ratio * std::abs(reference.line.mean));
  point.relative_db = 20.0 * std::log10(r.ratio);
  if (r.flag != Flag::noise) {
    point.phase_deg = is_tone ? 0.0 : kDegrees * std::arg(product(p).mean);
  }
  const bool is_reference = is_tone && !reference.both && p.k2 != 0;
  if (!is_reference) {
    point.expanded_u_db = kDbPerRelative * coverage_factor_95(r.dof) * r.u / r.ratio;
  }
  return point;
}

void TwoToneReading::list_products(const Reference& reference,
                                   std::vector<ProductPoint>& out) const {
  for (const ProductIndex p : products_) out.push_back(listed(p, reference));
}

}  // namespace kneeprint
