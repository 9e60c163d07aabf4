// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/square_sine.h"

#include <fmt/format.h>

#include <algorithm>
#include <array>
#include <bit>
#include <cmath>
#include <numbers>
#include <numeric>

#include "method/dim_signal.h"
#include "method/hold.h"
#include "method/tone_lines.h"
#include "quantity/failure.h"
#include "signal/fft.h"

namespace kneeprint {
namespace {

constexpr Hertz kLowestRate{96000.0};
constexpr double kDegrees = 180.0 / std::numbers::pi;

// One period of the sum of `harmonics`, dense enough that no peak is missed by more than 1e-4 of
// the highest harmonic.
std::vector<double> dense_period(const std::vector<std::complex<double>>& harmonics) {
  constexpr std::size_t kPerCycle = 256;
  const std::size_t size = std::bit_ceil(kPerCycle * harmonics.size());
  std::vector<std::complex<double>> spectrum(size / 2 + 1);
  for (std::size_t n = 0; n < harmonics.size(); ++n) {
    spectrum[n] = harmonics[n] * (static_cast<double>(size) / 2.0);
  }
  return inverse_fft(spectrum, size);
}

double largest(std::span<const double> x) {
  double peak = 0.0;
  for (const double v : x) peak = std::max(peak, std::abs(v));
  return peak;
}

CoherentPair tones(const TakeSpec& spec, Hertz rate) {
  return coherent_pair(kSquarePlayed, kDimSine, rate, spec.settings.block);
}

Seconds block_length(const TakeSpec& spec, Hertz rate) {
  return Seconds(static_cast<double>(tones(spec, rate).block) / rate.value());
}

int first_hold_blocks(const TakeSpec& spec, Hertz rate) {
  return kept_blocks(spec.settings, block_length(spec, rate)) + 1;
}

HoldLayout layout(const TakeSpec& spec, Hertz rate) {
  return held_layout(kSquarePlayed, rate, tones(spec, rate).block, spec.hold_blocks);
}

std::size_t length(const TakeSpec& spec, Hertz rate) {
  return held_length(kSquarePlayed, rate, tones(spec, rate).block, spec.hold_blocks);
}

Stimulus stimulus(const TakeSpec& spec, Hertz rate) {
  const CoherentPair pair = tones(spec, rate);
  const PlayedSquare square = played_square(rate);
  const double top = sine_peak(spec.send) / square.peak_with_sine();
  const double scale = top * static_cast<double>(pair.block) / 2.0;
  std::vector<std::complex<double>> spectrum(pair.block / 2 + 1);
  for (std::size_t n = 1; n < square.harmonics.size(); ++n) {
    spectrum[n * pair.cycles1] = scale * square.harmonics[n];
  }
  spectrum[pair.cycles2] = scale / kDimRatio;
  HeldStimulus held =
      held_period(inverse_fft(spectrum, pair.block), kSquarePlayed, rate, spec.hold_blocks);
  return {std::move(held.wave), held.hold, kSquarePlayed};
}

class SquareSineReading {
 public:
  SquareSineReading(const TakeSpec& spec, const TakeData& take, const RigView& rig)
      : spec_(spec),
        take_(take),
        rig_(rig),
        rate_(take.response.rate),
        square_(played_square(rate_)),
        hold_(layout(spec, rate_)),
        lines_(take.response, hold_, tones(spec, rate_), rig) {}

  TakeVerdict read(Curves& out);

 private:
  double drive() const;
  std::vector<double> rig_floor() const;
  ProductPoint row(ProductIndex p, const RelativeReading& r) const;
  RelativeReading over_sine(const Line& line, ProductIndex p, double floor) const;
  void stimulus_facts(Curves& out) const;
  std::span<const double> settled_block() const {
    return std::span(take_.response.samples)
        .subspan(hold_.first_block + hold_.block * static_cast<std::size_t>(first_), hold_.block);
  }

  const TakeSpec& spec_;
  const TakeData& take_;
  const RigView& rig_;
  Hertz rate_;
  PlayedSquare square_;
  HoldLayout hold_;
  ToneLines lines_;
  int first_ = 0;
  Flag take_flag_ = Flag::none;
  Line sine_;
  double drive_ = 0.0;
};

double SquareSineReading::drive() const {
  if (take_.reference != nullptr) {
    const ToneLines reference(*take_.reference, hold_, lines_.tones(), rig_);
    const double sine = std::abs(reference.product({0, 1}, first_).mean);
    return rig_.ret.level_of_peak(sine * kDimRatio * square_.peak_with_sine());
  }
  return rig_.send.level_of(spec_.send) +
         Decibels::of_ratio(std::abs(rig_.response.send(kDimSine).response)).value();
}

// The rig as y + a2 y^2 + a3 y^3 with a2 = 2 h2 / P, a3 = 4 h3 / P^2 from the harmonics that it
// shows with a sine of the same peak P (expansion of cos^2 and cos^3): what it makes of the
// response, at each product over the sine. Both parts are added in magnitude. Empty: unknown.
std::vector<double> SquareSineReading::rig_floor() const {
  const std::span<const double> block = settled_block();
  const double peak = largest(block);
  const LevelDbfs level(20.0 * std::log10(peak));
  const auto second = rig_.floor.at(spec_.send, level, 2);
  const auto third = rig_.floor.at(spec_.send, level, 3);
  if (!second || !third) return {};
  std::vector<double> square(block.size()), cube(block.size());
  for (std::size_t i = 0; i < block.size(); ++i) {
    const double y = block[i] / peak;
    square[i] = y * y;
    cube[i] = y * y * y;
  }
  const auto squared = forward_fft(square), cubed = forward_fft(cube);
  const double sine = std::abs(lines_.spectra().at(first_, lines_.tones().cycles2)) / peak;
  std::vector<double> floor;
  for (const ProductIndex p : dim_products()) {
    const std::size_t k = lines_.bin(p);
    const double scale = 2.0 / static_cast<double>(block.size());
    floor.push_back(
        scale * (2.0 * *second * std::abs(squared[k]) + 4.0 * *third * std::abs(cubed[k])) / sine);
  }
  return floor;
}

RelativeReading SquareSineReading::over_sine(const Line& line, ProductIndex p, double floor) const {
  return with_common(relate(std::abs(line.mean), line.u, line.dof, sine_, floor),
                     lines_.split_u(p));
}

ProductPoint SquareSineReading::row(ProductIndex p, const RelativeReading& r) const {
  ProductPoint point;
  point.method = "square-sine";
  point.f1_hz = lines_.tones().f1.value();
  point.f2_hz = lines_.tones().f2.value();
  point.drive = drive_;
  point.unit = rig_.ret.unit;
  point.k1 = p.k1;
  point.k2 = p.k2;
  point.order = p.order();
  point.frequency_hz = lines_.frequency(p).value();
  const std::array flags{take_flag_, r.flag};
  point.flag = gravest(flags);
  if (!(r.ratio > 0.0)) return point;
  point.level = rig_.ret.level_of_peak(r.ratio * std::abs(sine_.mean));
  point.relative_db = 20.0 * std::log10(r.ratio);
  if (r.u > 0.0) {
    point.expanded_u_db = kDbPerRelative * coverage_factor_95(r.dof) * r.u / r.ratio;
  }
  if (r.flag != Flag::noise) {
    point.phase_deg = p.order() == 1 ? 0.0 : kDegrees * std::arg(lines_.product(p, first_).mean);
  }
  return point;
}

void SquareSineReading::stimulus_facts(Curves& out) const {
  const auto fact = [&](const char* figure, const char* state, double value, const char* unit) {
    ScalarPoint s;
    s.method = "square-sine";
    s.drive = drive_;
    s.unit = rig_.ret.unit;
    s.figure = figure;
    s.state = state;
    s.value = value;
    s.value_unit = unit;
    out.scalars.push_back(s);
  };
  for (const auto& [state, pole] :
       {std::pair("dim-30", kDim30Pole), std::pair("dim-100", kDim100Pole)}) {
    fact("slope-fraction", state, square_.steepest_slope / steepest_slope(kDimSquare, pole), "1");
  }
  fact("band-limit", "-", square_.band_limit.value(), "Hz");
}

TakeVerdict SquareSineReading::read(Curves& out) {
  std::vector<std::size_t> watched;
  for (const ProductIndex p : {ProductIndex{1, 0}, {0, 1}, {-1, 1}, {5, -1}}) {
    watched.push_back(lines_.bin(p));
  }
  const Settled settled =
      judge_settling(lines_.spectra(), watched, spec_.settings, block_length(spec_, rate_));
  first_ = settled.first;
  TakeVerdict verdict;
  verdict.settled = settled.settled;
  verdict.settling = first_ * block_length(spec_, rate_);
  verdict.clipped = reaches_full_scale(take_.response, hold_);
  if (!settled.settled) take_flag_ = Flag::unsteady;
  if (verdict.clipped) take_flag_ = Flag::clipped;
  const Line fundamental = lines_.product({1, 0}, first_);
  sine_ = lines_.product({0, 1}, first_);
  const int averaged = lines_.spectra().blocks() - first_;
  if (!serves_as_reference(fundamental, averaged) || !serves_as_reference(sine_, averaged)) {
    return verdict;
  }
  drive_ = drive();

  const std::vector<double> floor = rig_floor();
  const auto products = dim_products();
  std::vector<Line> amplitudes;
  std::vector<RelativeReading> readings;
  double floor_squares = 0.0;
  out.products.push_back(row({1, 0}, over_sine(fundamental, {1, 0}, 0.0)));
  out.products.push_back(row({0, 1}, {1.0, 0.0, kInfiniteDof, Flag::none}));
  for (std::size_t i = 0; i < products.size(); ++i) {
    const double own = floor.empty() ? 0.0 : floor[i];
    floor_squares += own * own;
    amplitudes.push_back(lines_.product(products[i], first_));
    readings.push_back(over_sine(amplitudes.back(), products[i], own));
    out.products.push_back(row(products[i], readings.back()));
  }
  const RelativeReading sum = dim_figure(amplitudes, readings, sine_);
  IntermodPoint point;
  point.method = point.product = "square-sine";
  point.f1_hz = lines_.tones().f1.value();
  point.f2_hz = lines_.tones().f2.value();
  point.ratio = kDimRatio;
  point.drive = drive_;
  point.unit = rig_.ret.unit;
  point.blocks = lines_.spectra().blocks() - first_;
  point.settled_after_s = first_ * block_length(spec_, rate_).value();
  const std::array flags{take_flag_, sum.flag};
  point.flag = gravest(flags);
  if (sum.ratio > 0.0) {
    point.percent = 100.0 * sum.ratio;
    point.db = 20.0 * std::log10(sum.ratio);
    point.expanded_u_db = kDbPerRelative * coverage_factor_95(sum.dof) * sum.u / sum.ratio;
  }
  if (floor_squares > 0.0) point.floor_db = 10.0 * std::log10(floor_squares);
  out.intermods.push_back(point);
  stimulus_facts(out);
  return verdict;
}

TakeVerdict read(const TakeSpec& spec, const TakeData& take, const RigView& rig, Curves& out) {
  return SquareSineReading(spec, take, rig).read(out);
}

void check(const StepOptions&, Hertz rate) {
  if (rate < kLowestRate) {
    throw InputError(
        fmt::format("plan: method \"square-sine\" needs a sample rate of at least {} Hz, since "
                    "lower ones leave "
                    "nothing of a square's edges; this rig runs at {} Hz",
                    kLowestRate.value(), rate.value()));
  }
}

}  // namespace

double PlayedSquare::peak_with_sine() const { return peak + 1.0 / kDimRatio; }

PlayedSquare played_square(Hertz rate) {
  const double end = kHighestShare * rate.value();
  PlayedSquare square;
  square.harmonics = {0.0};
  for (int n = 1; n * kSquarePlayed.value() < end; ++n) {
    const double f = n * kSquarePlayed.value();
    const double x = std::numbers::pi * f / end;
    const double fade = std::sin(x) / x;
    square.harmonics.push_back(fade * square_harmonic(n, kSquarePlayed, kDim30Pole));
    if (n % 2 == 1) square.band_limit = Hertz(f);
  }
  square.peak = largest(dense_period(square.harmonics));
  std::vector<std::complex<double>> slope = square.harmonics;
  for (std::size_t n = 0; n < slope.size(); ++n) {
    slope[n] *= std::complex<double>(
        0.0, 2.0 * std::numbers::pi * kSquarePlayed.value() * static_cast<double>(n));
  }
  square.steepest_slope = largest(dense_period(slope));
  return square;
}

Method square_sine() {
  return {"square-sine",
          "square 3.15 kHz, band-limited, and sine 15 kHz, 4:1",
          "after IEC 60268-3 (dynamic intermodulation), within the converters' band",
          Placement::every_rung,
          {.id = "square-sine"},
          first_hold_blocks,
          block_length,
          stimulus,
          read,
          nullptr,
          check,
          length};
}

}  // namespace kneeprint
