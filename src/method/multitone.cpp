// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/multitone.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

#include "method/fill.h"
#include "method/hold.h"
#include "method/mains_lines.h"
#include "method/periodic_power.h"
#include "method/reading.h"
#include "signal/hearing.h"
#include "signal/multitone_design.h"

namespace kneeprint {
namespace {

constexpr int kFirstErb = 1, kLastErb = 41;
constexpr int kErbBands = kLastErb - kFirstErb;
constexpr double kSeenChance = 0.05;     // as for every figure: noise alone exceeds it in 5 %
constexpr double kLeastOverNoise = 5.0;  // as for a steady sine: below, no reference for anything

std::size_t lowest_cycles() { return multitone_tones().front().cycles; }

Hertz bin_width(Hertz rate) { return rate / static_cast<double>(multitone_block(rate)); }

Hertz lowest_tone(Hertz rate) { return static_cast<double>(lowest_cycles()) * bin_width(rate); }

Seconds block_length(const TakeSpec&, Hertz rate) {
  return Seconds(static_cast<double>(multitone_block(rate)) / rate.value());
}

int first_hold_blocks(const TakeSpec& spec, Hertz rate) {
  return kept_blocks(spec.settings, block_length(spec, rate)) + 1;
}

Stimulus stimulus(const TakeSpec& spec, Hertz rate) {
  std::vector<double> period = multitone_period(multitone_block(rate));
  const double peak = sine_peak(spec.send);
  for (double& x : period) x *= peak;
  HeldStimulus held = held_period(period, lowest_tone(rate), rate, spec.hold_blocks);
  return {std::move(held.wave), held.hold, lowest_tone(rate)};
}

// The part of the spectrum between two edges.
struct Band {
  Hertz low, high;
  PeriodicPower even{}, odd{};
  double rig_second = 0.0, rig_third = 0.0;  // sums of MultitoneProducts squared

  PeriodicPower both() const {
    PeriodicPower sum = even;
    return sum += odd;
  }
};

// What the rig itself may show, as amplitude (rms).
using Floor = std::optional<double>;

class MultitoneReading {
 public:
  MultitoneReading(const TakeSpec& spec, const TakeData& take, const RigView& rig)
      : spec_(spec),
        take_(take),
        rig_(rig),
        rate_(take.response.rate),
        layout_(held_layout(lowest_tone(rate_), rate_, multitone_block(rate_), spec.hold_blocks)),
        spectra_(take.response, layout_, 1),
        mains_lines_(spectra_),
        listening_(spec.options.listening_db_spl.value_or(kDefaultListeningDbSpl)) {}

  TakeVerdict read(Curves& out);

 private:
  double width() const { return spectra_.bin_width(); }
  int kept() const { return spectra_.blocks() - first_; }
  std::vector<std::complex<double>> over_blocks(std::size_t bin, int first) const;
  std::complex<double> mean_line(std::size_t bin) const;

  void find_reach();
  void follow_drift();
  Settled settle() const;
  double noise_around(std::size_t low, std::size_t high, int first) const;
  void sort_bins();
  void read_tones();
  void read_drive();
  void read_floor();

  Floor floor_of(double second, double third) const;
  Uncertain with_floor(Uncertain power, Floor floor) const;
  ScalarPoint blank(const std::string& figure, const std::string& unit) const;
  ScalarPoint distortion(const std::string& figure, const PeriodicPower& power, Floor floor) const;
  void add_scalars(Curves& out) const;
  void add_bands(Curves& out) const;
  FillReading fill(std::span<const double> thresholds) const;

  const TakeSpec& spec_;
  const TakeData& take_;
  const RigView& rig_;
  Hertz rate_;
  HoldLayout layout_;
  BlockSpectra spectra_;
  MainsLines mains_lines_;
  double listening_;
  int first_ = 0;
  Flag take_flag_ = Flag::none;
  std::size_t low_ = 0, high_ = 0;       // bins that are read
  std::vector<MultitoneTone> in_reach_;  // tones among them
  std::vector<double> turn_;             // radians per bin that each block has drifted
  std::vector<bool> tone_bins_;
  std::vector<Band> bands_;  // below the first ERB band, kErbBands of them, above the last
  Uncertain mains_;          // mean square
  Uncertain tones_;          // mean square
  double noise_in_tones_ = 0.0;
  std::vector<AudibleTone> heard_;
  double drive_ = 0.0;
  std::optional<double> second_, third_;  // the rig's own with a sine of this peak
};

void MultitoneReading::find_reach() {
  constexpr double kRounding = 1e-9;
  const double top = std::min(kBandHigh.value(), kHighestShare * rig_.usable_rate(rate_).value());
  low_ = static_cast<std::size_t>(std::ceil(kBandLow.value() / width() - kRounding));
  high_ = std::min(static_cast<std::size_t>(std::floor(top / width() + kRounding)),
                   spectra_.bins() - 1);
  for (const MultitoneTone& t : multitone_tones()) {
    if (t.cycles <= high_) in_reach_.push_back(t);
  }
  if (in_reach_.size() < kMultitoneTones) take_flag_ = Flag::alias;
  tone_bins_.assign(high_ + 1, false);
  for (const MultitoneTone& t : in_reach_) tone_bins_[t.cycles] = true;
}

std::vector<std::complex<double>> MultitoneReading::over_blocks(std::size_t bin, int first) const {
  std::vector<std::complex<double>> out;
  for (int b = first; b < spectra_.blocks(); ++b) {
    const double turned = turn_[static_cast<std::size_t>(b)] * static_cast<double>(bin);
    const std::complex<double> leaked =
        MainsLines::is_multiple(bin) ? 0.0 : mains_lines_.leakage(b, bin);
    out.push_back((spectra_.at(b, bin) - leaked) * std::polar(1.0, -turned));
  }
  return out;
}

std::complex<double> MultitoneReading::mean_line(std::size_t bin) const {
  std::complex<double> sum = 0.0;
  for (const auto& z : over_blocks(bin, first_)) sum += z;
  return sum / static_cast<double>(kept());
}

// A delay that drifts turns tones and products alike in proportion to their frequency. Its slope
// over frequency comes from the tones, by least squares from the lowest up, each one unwrapped by
// those before.
void MultitoneReading::follow_drift() {
  for (int b = 0; b < spectra_.blocks(); ++b) {
    double slope = 0.0, products = 0.0, squares = 0.0;
    for (const MultitoneTone& t : in_reach_) {
      const auto k = static_cast<double>(t.cycles);
      const std::complex<double> turned =
          spectra_.at(b, t.cycles) * std::conj(spectra_.at(0, t.cycles));
      const double predicted = slope * k;
      const double phase =
          predicted + std::remainder(std::arg(turned) - predicted, 2.0 * std::numbers::pi);
      products += std::abs(turned) * k * phase;
      squares += std::abs(turned) * k * k;
      if (squares > 0.0) slope = products / squares;
    }
    turn_.push_back(slope);
  }
}

// Component variance of the noise of one block in the bins between two tones: the median over the
// bins, which neither hum nor a single product that still drifts moves.
double MultitoneReading::noise_around(std::size_t low, std::size_t high, int first) const {
  std::vector<double> variances;
  for (std::size_t k = low; k <= high; ++k) {
    if (tone_bins_[k]) continue;
    PeriodicPower bin;
    bin.add(over_blocks(k, first));
    bin.close_group();
    variances.push_back(bin.noise().value);
  }
  if (variances.empty()) return 0.0;
  const auto middle = variances.begin() + static_cast<long>(variances.size() / 2);
  std::nth_element(variances.begin(), middle, variances.end());
  return *middle;
}

// Powers of three groups of tones, and of even and odd products, over the blocks.
Settled MultitoneReading::settle() const {
  constexpr std::size_t kGroups = 3;
  constexpr double kClearOfNoise = 100.0;  // 20 dB
  const int blocks = spectra_.blocks();
  const int keep = kept_blocks(spec_.settings, block_length(spec_, rate_));
  const int last = blocks - keep;  // these drift least
  std::vector<std::vector<double>> levels;
  levels.reserve(kGroups + 2);
  std::vector<BlockTrend> trends;

  // `noise` of a bin: component variance in one block. u(P)^2 = sum |z|^2 sigma^2.
  const auto follow = [&](std::span<const std::size_t> bins, std::span<const double> noise) {
    std::vector<double> decibels;
    double least = INFINITY, spread = 0.0, floor = 0.0;
    for (int b = 0; b < blocks; ++b) {
      double power = 0.0;
      for (const std::size_t k : bins) power += 0.5 * std::norm(spectra_.at(b, k));
      decibels.push_back(10.0 * std::log10(power));
      least = std::min(least, power);
    }
    for (std::size_t i = 0; i < bins.size(); ++i) {
      spread += std::norm(spectra_.at(blocks - 1, bins[i])) * noise[i];
      floor += noise[i];
    }
    if (!(least > kClearOfNoise * floor) || least <= 0.0) return;
    levels.push_back(std::move(decibels));
    trends.push_back({levels.back(), 0.5 * kDbPerRelative * std::sqrt(spread) / least});
  };

  for (std::size_t g = 0; g < kGroups; ++g) {
    const std::size_t begin = g * in_reach_.size() / kGroups,
                      end = (g + 1) * in_reach_.size() / kGroups;
    if (begin == end) continue;
    std::vector<std::size_t> bins;
    for (std::size_t t = begin; t < end; ++t) bins.push_back(in_reach_[t].cycles);
    const std::vector<double> noise(bins.size(), noise_around(bins.front(), bins.back(), last));
    follow(bins, noise);
  }
  for (const std::size_t parity : {0U, 1U}) {
    std::vector<std::size_t> bins;
    std::vector<double> noise;
    for (std::size_t k = low_ + (low_ + parity) % 2; k <= high_; k += 2) {
      if (tone_bins_[k] || MainsLines::is_multiple(k)) continue;
      PeriodicPower bin;
      bin.add(over_blocks(k, last));
      bin.close_group();
      bins.push_back(k);
      noise.push_back(bin.noise().value);
    }
    follow(bins, noise);
  }
  return find_settled(trends, blocks, keep, block_length(spec_, rate_),
                      spec_.settings.longest_time_constant, spec_.settings.wanted_uncertainty);
}

void MultitoneReading::sort_bins() {
  std::vector<Hertz> edges{Hertz(0.0)};
  for (int n = kFirstErb; n <= kLastErb; ++n) edges.push_back(frequency_of_erb_number(n));
  edges.emplace_back(INFINITY);
  for (std::size_t i = 0; i + 1 < edges.size(); ++i) bands_.push_back({edges[i], edges[i + 1]});

  const MultitoneProducts& products = multitone_products();
  std::vector<double> hum(static_cast<std::size_t>(kept()));
  auto band = bands_.begin();
  for (std::size_t k = low_; k <= high_; ++k) {
    while (static_cast<double>(k) * width() >= band->high.value()) ++band;
    if (tone_bins_[k]) continue;
    if (MainsLines::is_multiple(k)) {
      for (int b = first_; b < spectra_.blocks(); ++b) {
        hum[static_cast<std::size_t>(b - first_)] += 0.5 * std::norm(spectra_.at(b, k));
      }
      continue;
    }
    (k % 2 == 0 ? band->even : band->odd).add(over_blocks(k, first_));
    if (k < products.second.size()) {
      band->rig_second += products.second[k] * products.second[k];
      band->rig_third += products.third[k] * products.third[k];
    }
  }
  for (Band& b : bands_) {
    b.even.close_group();
    b.odd.close_group();
  }
  const auto m = static_cast<double>(hum.size());
  double mean = 0.0, scatter = 0.0;
  for (const double h : hum) mean += h / m;
  for (const double h : hum) scatter += (h - mean) * (h - mean);
  mains_ = {mean, std::sqrt(scatter / (m - 1.0) / m), m - 1.0};
}

void MultitoneReading::read_tones() {
  double variance = 0.0;
  auto band = bands_.begin();
  std::vector<double> powers;
  for (const MultitoneTone& t : in_reach_) {
    while (static_cast<double>(t.cycles) * width() >= band->high.value()) ++band;
    powers.push_back(0.5 * std::norm(mean_line(t.cycles)));
    tones_.value += powers.back();
    const double noise = band->both().noise_per_bin();
    noise_in_tones_ += noise;
    variance += 2.0 * powers.back() * noise;
  }
  tones_.u = std::sqrt(variance);
  for (std::size_t i = 0; i < powers.size(); ++i) {
    if (!(powers[i] > 0.0)) continue;
    heard_.push_back({Hertz(static_cast<double>(in_reach_[i].cycles) * width()),
                      listening_ + 10.0 * std::log10(powers[i] / tones_.value)});
  }
}

void MultitoneReading::read_drive() {
  drive_ = rig_.send.level_of(spec_.send);
  if (take_.reference == nullptr) return;
  // A patched return may shift phases, and with them the peak: the tones' power tells the drive.
  const BlockSpectra reference(*take_.reference, layout_, 1);
  double power = 0.0;
  for (int b = first_; b < reference.blocks(); ++b) {
    for (const MultitoneTone& t : multitone_tones()) {
      power += reference.band_power(b, t.cycles, t.cycles) / kept();
    }
  }
  if (power > 0.0) drive_ = rig_.ret.level_of_peak(multitone_crest() * std::sqrt(power));
}

void MultitoneReading::read_floor() {
  double peak = 0.0;
  for (std::size_t n = layout_.first_block; n < layout_.end(); ++n) {
    peak = std::max(peak, std::abs(take_.response.samples[n]));
  }
  const LevelDbfs returned(20.0 * std::log10(peak));
  second_ = rig_.floor.at(spec_.send, returned, 2);
  third_ = rig_.floor.at(spec_.send, returned, 3);
}

// Even and odd products of the rig stand in different bins, so powers add.
Floor MultitoneReading::floor_of(double second, double third) const {
  if (!second_ || !third_) return std::nullopt;
  return std::sqrt(tones_.value) *
         std::hypot(*second_ * std::sqrt(second), *third_ * std::sqrt(third));
}

// A part of known amplitude and unknown phase: u(a) = floor / sqrt 2, and the power is a^2.
Uncertain MultitoneReading::with_floor(Uncertain power, Floor floor) const {
  if (!floor || !(power.value > 0.0)) return power;
  const std::array parts{
      Contribution{power.u, power.dof},
      Contribution{std::numbers::sqrt2 * std::sqrt(power.value) * *floor, kInfiniteDof}};
  const Contribution c = combine(parts);
  return {power.value, c.u, c.dof};
}

ScalarPoint MultitoneReading::blank(const std::string& figure, const std::string& unit) const {
  ScalarPoint p;
  p.method = "multitone";
  p.drive = drive_;
  p.unit = rig_.ret.unit;
  p.figure = figure;
  p.value_unit = unit;
  p.flag = take_flag_;
  return p;
}

// Value with uncertainty when it was seen, else upper limit.
ScalarPoint MultitoneReading::distortion(const std::string& figure, const PeriodicPower& power,
                                         Floor floor) const {
  ScalarPoint p = blank(figure, "dB");
  if (floor && *floor > 0.0) {
    p.floor = 10.0 * std::log10(*floor * *floor / tones_.value);
  }
  Flag own = Flag::none;
  if (power.seen(kSeenChance)) {
    const Uncertain read = power.periodic();
    const PowerRatio ratio = in_decibels(with_floor(read, floor), tones_);
    p.value = ratio.db;
    p.expanded_u = ratio.expanded_u_db;
    if (floor && read.value <= *floor * *floor) own = Flag::floor;
  } else {
    own = Flag::noise;
    p.value = in_decibels({power.upper_limit()}, tones_).db;
  }
  const std::array flags{take_flag_, own};
  p.flag = gravest(flags);
  return p;
}

void MultitoneReading::add_scalars(Curves& out) const {
  PeriodicPower even{}, odd{};
  double second = 0.0, third = 0.0;
  for (const Band& b : bands_) {
    even += b.even;
    odd += b.odd;
    second += b.rig_second;
    third += b.rig_third;
  }
  PeriodicPower both = even;
  both += odd;

  const auto plain = [&](const std::string& figure, const Uncertain& power) {
    const PowerRatio ratio = in_decibels(power, tones_);
    ScalarPoint p = blank(figure, "dB");
    p.value = ratio.db;
    p.expanded_u = ratio.expanded_u_db;
    return p;
  };
  const Floor floor = floor_of(second, third);
  const Uncertain total = with_floor(both.total(), floor);
  const std::array parts{Contribution{total.u, total.dof}, Contribution{mains_.u, mains_.dof}};
  const Contribution c = combine(parts);
  out.scalars.push_back(plain("noise-plus-distortion", {total.value + mains_.value, c.u, c.dof}));
  out.scalars.push_back(distortion("distortion", both, floor));
  out.scalars.push_back(distortion("even-distortion", even, floor_of(second, 0.0)));
  out.scalars.push_back(distortion("odd-distortion", odd, floor_of(0.0, third)));
  out.scalars.push_back(plain("noise", both.noise()));
  out.scalars.push_back(plain("mains-multiples", mains_));
}

void MultitoneReading::add_bands(Curves& out) const {
  const double to_spl = listening_ - 10.0 * std::log10(tones_.value);
  std::vector<BandAudibility> audible;
  double rig_filled = 0.0;
  for (std::size_t i = 1; i <= kErbBands; ++i) {
    const Band& band = bands_[i];
    if (band.high.value() > static_cast<double>(high_) * width()) continue;
    const Hertz centre = frequency_of_erb_number(kFirstErb - 0.5 + static_cast<double>(i));
    const PeriodicPower power = band.both();
    const Floor floor = floor_of(band.rig_second, band.rig_third);
    const double threshold = masked_threshold(centre, heard_);

    const auto trace = [&](const std::string& name, Cell db, Cell u, Flag flag) {
      TracePoint t;
      t.method = "multitone";
      t.drive = drive_;
      t.unit = rig_.ret.unit;
      t.trace = name;
      t.x = centre.value();
      t.x_unit = "Hz";
      if (db) t.value = *db;
      t.value_unit = "dB SPL";
      t.expanded_u = u;
      t.flag = flag;
      out.traces.push_back(t);
    };
    const auto in_spl = [&](const Uncertain& p) {
      PowerRatio r = in_decibels(p, tones_);
      if (r.db) *r.db += listening_;
      return r;
    };
    const ScalarPoint read = distortion("", power, floor);
    trace("distortion", read.value ? Cell(*read.value + listening_) : Cell(), read.expanded_u,
          read.flag);
    const PowerRatio noise = in_spl(power.noise());
    trace("noise", noise.db, noise.expanded_u_db, take_flag_);
    const PowerRatio total = in_spl(with_floor(power.total(), floor));
    trace("noise-plus-distortion", total.db, total.expanded_u_db, take_flag_);
    trace("masked-threshold", threshold, std::nullopt, take_flag_);

    // Among so many bands one in twenty would show distortion that is noise: for fill, noise alone
    // exceeds the limit in any of them in 5 % of takes.
    const double masked = std::pow(10.0, (threshold - to_spl) / 10.0);
    const Uncertain periodic = with_floor(power.periodic(), floor);
    const double rig = floor.value_or(0.0);
    BandAudibility b{masked, periodic.value, periodic.u, 0.0, Flag::none};
    b.upper = std::pow(std::sqrt(power.upper_limit()) + rig, 2);
    if (!power.seen(kSeenChance / kErbBands)) {
      b.flag = Flag::noise;
    } else if (periodic.value <= rig * rig) {
      b.flag = Flag::floor;
    }
    audible.push_back(b);
    if (rig * rig >= masked) rig_filled += 1.0;
  }
  if (audible.empty()) return;

  const FillReading read = fill_of(audible);
  ScalarPoint fill = blank("fill", "%");
  fill.state = fmt::format("{} dB SPL", listening_);
  fill.value = read.percent;
  fill.expanded_u = read.expanded_u;
  if (second_ && third_) fill.floor = 100.0 * rig_filled / static_cast<double>(audible.size());
  const std::array flags{take_flag_, read.flag};
  fill.flag = gravest(flags);
  out.scalars.push_back(fill);
  ScalarPoint level = blank("listening-level", "dB SPL");
  level.state = fill.state;
  level.value = listening_;
  level.flag = Flag::none;
  out.scalars.push_back(level);
}

TakeVerdict MultitoneReading::read(Curves& out) {
  find_reach();
  follow_drift();
  const Settled settled = settle();
  first_ = settled.first;
  TakeVerdict verdict;
  verdict.settled = settled.settled;
  verdict.clipped = reaches_full_scale(take_.response, layout_);
  const std::array flags{take_flag_, settled.settled ? Flag::none : Flag::unsteady,
                         verdict.clipped ? Flag::clipped : Flag::none};
  take_flag_ = gravest(flags);
  sort_bins();
  read_tones();
  read_drive();
  // Silence, or a unit that passes nothing: there is nothing to refer a figure to.
  if (!(tones_.value > kLeastOverNoise * kLeastOverNoise * noise_in_tones_)) {
    ScalarPoint p = blank("noise-plus-distortion", "dB");
    p.flag = Flag::noise;
    out.scalars.push_back(p);
    return verdict;
  }
  read_floor();
  add_scalars(out);
  add_bands(out);
  return verdict;
}

TakeVerdict read(const TakeSpec& spec, const TakeData& take, const RigView& rig, Curves& out) {
  return MultitoneReading(spec, take, rig).read(out);
}

}  // namespace

Method multitone() {
  return {"multitone",
          "multitone and fill",
          "Glasberg & Moore 1990 (bands); Pintelon & Schoukens 2012 (odd multitone)",
          Placement::every_rung,
          {.id = "multitone", .listening = true},
          first_hold_blocks,
          block_length,
          stimulus,
          read,
          nullptr};
}

}  // namespace kneeprint
