// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/swept.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

#include "method/hold.h"
#include "method/reading.h"
#include "method/rig_curvature.h"
#include "method/sweep_responses.h"
#include "method/sweep_scatter.h"
#include "signal/fft.h"

namespace kneeprint {
namespace {

constexpr Hertz kStart{10.0};
constexpr double kFallShare = 0.46, kStopShare = 0.49;  // of the rate
constexpr Seconds kDefault{5.0}, kShortest{4.0};
constexpr Seconds kGap{0.2};
constexpr int kFirstRepeats = 3;

constexpr int kPerOctave = 12;
// More than an octave above the end of the rise its edge is gone (under 1e-4 dB with the shortest
// sweep).
constexpr Hertz kLowestRow{49.0};
// Read for the slope of the response alone: a third of an octave on either side.
constexpr std::size_t kSlopeSteps = 4;
constexpr std::size_t kGroup = 4;  // fundamentals that share a window: a third of an octave

constexpr double kLeastOverNoise = 5.0;  // below, the fundamental is no reference for phases
constexpr double kDegrees = 180.0 / std::numbers::pi;

LogSweep sweep_of(const TakeSpec& spec, Hertz rate) {
  const Seconds duration = std::max(kShortest, spec.options.duration.value_or(kDefault));
  return {kStart, kFallShare * rate, kStopShare * rate, duration};
}

// A fast transform's length whose repeats meet the mains at another phase each time: hum is then
// seen as scatter and averaged, not taken for a response.
std::size_t block_samples(const LogSweep& sweep, Hertz rate) {
  const auto turns = [&](std::size_t n, double mains) {
    return std::abs(std::remainder(mains * static_cast<double>(n) / rate.value(), 1.0));
  };
  constexpr double kLeast = 0.15;
  constexpr std::size_t kEven = 16;  // some even factors make faster transforms than none
  const auto fast = [](std::size_t n) { return kEven * fast_length((n + kEven - 1) / kEven); };
  const std::size_t least = fast(samples_in(sweep.duration() + kGap, rate));
  for (std::size_t n = least; n < least + least / 4; n = fast(n + 1)) {
    if (turns(n, 50.0) >= kLeast && turns(n, 60.0) >= kLeast) return n;
  }
  return least;  // a rate of a few hundred hertz
}

Seconds block_length(const TakeSpec& spec, Hertz rate) {
  return Seconds(static_cast<double>(block_samples(sweep_of(spec, rate), rate)) / rate.value());
}

int first_hold_blocks(const TakeSpec&, Hertz) { return kFirstRepeats; }

HoldLayout layout_of(const TakeSpec& spec, Hertz rate) {
  return {samples_in(kHoldMargin, rate), block_samples(sweep_of(spec, rate), rate),
          std::max(2, spec.hold_blocks)};
}

Stimulus stimulus(const TakeSpec& spec, Hertz rate) {
  Stimulus out;
  out.hold = layout_of(spec, rate);
  out.lowest_tone = kStart;
  out.wave.rate = rate;
  out.wave.samples.assign(out.hold.end() + samples_in(kHoldMargin, rate), 0.0);
  const std::vector<double> sweep = sweep_of(spec, rate).samples(rate);
  const double peak = sine_peak(spec.send);
  for (int b = 0; b < out.hold.blocks; ++b) {
    const std::size_t start = out.hold.first_block + static_cast<std::size_t>(b) * out.hold.block;
    for (std::size_t i = 0; i < sweep.size(); ++i) out.wave.samples[start + i] = peak * sweep[i];
  }
  return out;
}

double wrapped_degrees(double radians) {
  return std::remainder(radians, 2.0 * std::numbers::pi) * kDegrees;
}

std::vector<double> mean_block(const Waveform& take, const HoldLayout& hold, int first) {
  // In pieces that stay in the cache until all blocks are in.
  constexpr std::size_t kPiece = 4096;
  const auto block = [&](int b) {
    return take.samples.data() + hold.first_block + static_cast<std::size_t>(b) * hold.block;
  };
  std::vector<double> mean(block(first), block(first) + hold.block);
  for (std::size_t start = 0; start < hold.block; start += kPiece) {
    const std::size_t end = std::min(hold.block, start + kPiece);
    for (int b = first + 1; b < hold.blocks; ++b) {
      const double* x = block(b);
      for (std::size_t i = start; i < end; ++i) mean[i] += x[i];
    }
    for (std::size_t i = start; i < end; ++i) mean[i] /= hold.blocks - first;
  }
  return mean;
}

// Twelve an octave, counted from 1 kHz, from `lowest` up.
std::vector<Hertz> fundamentals_from(Hertz lowest, Hertz usable_rate) {
  std::vector<Hertz> out;
  int step = static_cast<int>(std::ceil(kPerOctave * std::log2(lowest / Hertz(1000.0))));
  for (;; ++step) {
    const Hertz f(1000.0 * std::exp2(static_cast<double>(step) / kPerOctave));
    if (f >= kHighestShare * usable_rate) return out;
    out.push_back(f);
  }
}

class SweptReading {
 public:
  SweptReading(const TakeSpec& spec, const TakeData& take, const RigView& rig)
      : spec_(spec),
        take_(take),
        rig_(rig),
        rate_(take.response.rate),
        highest_(kHighestShare * rig.usable_rate(rate_)),
        sweep_(sweep_of(spec, rate_)),
        hold_(layout_of(spec, rate_)) {
    const double below = std::exp2(-static_cast<double>(kSlopeSteps) / kPerOctave);
    fundamentals_ = fundamentals_from(below * kLowestRow, rig.usable_rate(rate_));
  }

  TakeVerdict read(Curves& out);

 private:
  // One order's responses, by fundamental, as they left the unit (the return's share of the rig's
  // response taken out): sample values (peak) with their type A uncertainty.
  using Order = std::vector<Line>;
  Order order_of(const SweepResponses& responses, const SweepScatter& scatter, int n) const;
  SweepScatter scatter_of(const Waveform& take, int orders) const;
  void read_speed();
  std::vector<double> floor_at(std::size_t i) const;
  ResponsePoint row(int n, std::size_t i, double floor) const;
  double drive_at(std::size_t i) const;
  double speed_u(int n, std::size_t i) const;
  const Line* at(int n, std::size_t i) const {
    const Order& order = orders_[static_cast<std::size_t>(n - 1)];
    return i < order.size() ? &order[i] : nullptr;
  }

  const TakeSpec& spec_;
  const TakeData& take_;
  const RigView& rig_;
  Hertz rate_, highest_;
  LogSweep sweep_;
  HoldLayout hold_;
  std::vector<Hertz> fundamentals_;
  std::vector<Order> orders_;
  Order reference_;            // empty: none
  std::vector<double> speed_;  // f' / (4 pi) |H''/H|, relative
  Flag take_flag_ = Flag::none;
};

SweepScatter SweptReading::scatter_of(const Waveform& take, int orders) const {
  return {sweep_,
          take,
          hold_,
          orders,
          fundamentals_.front(),
          highest_,
          spec_.settings.wanted_uncertainty};
}

SweptReading::Order SweptReading::order_of(const SweepResponses& responses,
                                           const SweepScatter& scatter, int n) const {
  Order out;
  for (std::size_t i = 0; i < fundamentals_.size(); i += kGroup) {
    std::vector<Hertz> group;
    for (std::size_t g = i; g < std::min(i + kGroup, fundamentals_.size()); ++g) {
      if (n * fundamentals_[g] < highest_) group.push_back(fundamentals_[g]);
    }
    const OrderResponse r = responses.read(n, group);
    for (std::size_t g = 0; g < group.size(); ++g) {
      const Contribution c = scatter.u(n, group[g], r.window_energy);
      const std::complex<double> share = rig_.response.ret(n * group[g]).response;
      out.push_back({r.gain[g] / share, c.u / std::abs(share), c.dof});
    }
    if (group.size() < kGroup) break;
  }
  return out;
}

// With H = exp(a + j b) over x = ln f: f^2 H''/H = (ln H)'' - (ln H)' + ((ln H)')^2. A pure delay
// moves the sweep and bends nothing, so the last term keeps the slope of the magnitude alone.
void SweptReading::read_speed() {
  const Order& h = orders_.front();
  std::vector<double> magnitude, phase;
  for (const Line& l : h) {
    magnitude.push_back(std::log(std::abs(l.mean)));
    const double angle = std::arg(l.mean);
    const double before = phase.empty() ? angle : phase.back();
    phase.push_back(before + std::remainder(angle - before, 2.0 * std::numbers::pi));
  }
  constexpr double step = kSlopeSteps * std::numbers::ln2 / kPerOctave;
  // The quotients of finite differences for which a delay, exp(x), has no bend at all.
  static const double kDelayFree = (2.0 * std::cosh(step) - 2.0) / (step * std::sinh(step));
  speed_.assign(h.size(), 0.0);
  if (h.size() <= 2 * kSlopeSteps) return;
  for (std::size_t i = 0; i < h.size(); ++i) {
    const std::size_t mid = std::clamp(i, kSlopeSteps, h.size() - 1 - kSlopeSteps);
    const std::size_t low = mid - kSlopeSteps, high = mid + kSlopeSteps;
    const auto slope = [&](const auto& v) { return (v[high] - v[low]) / (2.0 * step); };
    const auto bend = [&](const auto& v) {
      return (v[high] - 2.0 * v[mid] + v[low]) / (step * step);
    };
    const double a = slope(magnitude);
    const double ratio =
        std::hypot(bend(magnitude) - a + a * a, bend(phase) - kDelayFree * slope(phase));
    const double turns = cycles(fundamentals_[mid], sweep_.growth());
    speed_[i] = ratio / (4.0 * std::numbers::pi * turns);
    if (!std::isfinite(speed_[i])) speed_[i] = 0.0;  // no response at all
  }
}

// Relative, standard: a bound becomes a rectangular distribution. Order 1 is touched only as far as
// the curve bends it: d ln H1 / d ln A - 1 is 6 H3/H1 for a cubic. Where orders 2 and 3 are out of
// reach, the highest fundamental at which they are not stands for it.
double SweptReading::speed_u(int n, std::size_t i) const {
  double share = n;
  if (n == 1) {
    const std::size_t seen = orders_[std::min<std::size_t>(2, orders_.size() - 1)].size();
    const std::size_t at_most = std::min(i, std::max<std::size_t>(1, seen) - 1);
    double squares = 0.0;
    for (int k = 2; k <= spec_.settings.orders; ++k) {
      if (const Line* l = at(k, at_most)) squares += std::norm(l->mean);
    }
    share = std::min(1.0, 6.0 * std::sqrt(squares) / std::abs(at(1, at_most)->mean));
  }
  return share * speed_[i] / std::sqrt(3.0);
}

// The rig's residual relative to the fundamental, by order; empty: unknown. Its curvature reaches
// every order of the response. The offset that goes with order 2 of a square law is as large as it.
std::vector<double> SweptReading::floor_at(std::size_t i) const {
  const double carrier = std::abs(at(1, i)->mean);
  const Hertz f = fundamentals_[i];
  const LevelDbfs returned(20.0 * std::log10(carrier * std::abs(rig_.response.ret(f).response)));
  const auto loop = [&](int n) { return rig_.floor.at(spec_.send, returned, n, f); };
  if (!loop(2) || !loop(3)) return {};
  std::vector<std::complex<double>> harmonics{0.0};
  for (int n = 1; n <= spec_.settings.orders; ++n) {
    const Line* l = at(n, i);
    harmonics.push_back(l != nullptr ? l->mean / carrier : 0.0);
  }
  if (harmonics.size() > 2) harmonics[0] = std::abs(harmonics[2]);
  std::vector<double> floor = curvature_floor(harmonics, *loop(2), *loop(3));
  for (std::size_t n = 4; n < floor.size(); ++n) {
    floor[n] += loop(static_cast<int>(n)).value_or(0.0);
  }
  return floor;
}

double SweptReading::drive_at(std::size_t i) const {
  if (reference_.empty()) {
    const double send = std::abs(rig_.response.send(fundamentals_[i]).response);
    return rig_.send.level_of(spec_.send) + Decibels::of_ratio(send).value();
  }
  return rig_.ret.level_of_peak(std::abs(reference_[i].mean));
}

ResponsePoint SweptReading::row(int n, std::size_t i, double floor) const {
  const Line& fundamental = *at(1, i);
  const Line& line = *at(n, i);
  ResponsePoint p{
      fundamentals_[i].value(), drive_at(i), rig_.ret.unit, n, {}, {}, {}, take_flag_, "sweep"};
  const double carrier = std::abs(fundamental.mean);
  if (!(carrier > 0.0) || !(std::abs(line.mean) > 0.0)) {
    const std::array flags{take_flag_, Flag::noise};
    p.flag = gravest(flags);
    return p;
  }
  // Alone, not over the fundamental: the reference's own uncertainty stays out.
  const RelativeReading r =
      relate(std::abs(line.mean), line.u, line.dof, Line{fundamental.mean}, floor);
  const std::array flags{take_flag_, r.flag};
  p.flag = gravest(flags);
  if (rig_.gain_known) p.magnitude_db = rig_.ret.level_of_peak(r.ratio * carrier) - p.drive;
  std::vector<Contribution> parts{{kDbPerRelative * r.u / r.ratio, r.dof},
                                  {kDbPerRelative * speed_u(n, i), kInfiniteDof},
                                  {rig_.ret.standard_uncertainty.value(), kInfiniteDof}};
  // Send and return together are what the loop showed: their split touches harmonics alone.
  if (n > 1) {
    const Hertz f = fundamentals_[i];
    parts.push_back({rig_.response.ret_ratio(n * f, f).u.value(), kInfiniteDof});
  }
  if (reference_.empty()) {
    parts.push_back({rig_.send.standard_uncertainty.value(), kInfiniteDof});
  } else {
    const Line& input = reference_[i];
    parts.push_back({kDbPerRelative * input.u / std::abs(input.mean), input.dof});
  }
  const Contribution c = combine(parts);
  p.expanded_u_db = coverage_factor_95(c.dof) * c.u;
  if (r.flag == Flag::noise) return p;
  if (n > 1) {
    if (carrier < kLeastOverNoise * fundamental.u) return p;
    p.phase_deg = wrapped_degrees(std::arg(line.mean) - n * std::arg(fundamental.mean));
  } else if (reference_.empty()) {
    const double sent = std::arg(rig_.response.send(fundamentals_[i]).response);
    const double turns = p.frequency_hz * take_.delay / rate_.value();
    p.phase_deg = wrapped_degrees(std::arg(line.mean) - sent + 2.0 * std::numbers::pi * turns);
  } else {
    p.phase_deg = wrapped_degrees(std::arg(line.mean / reference_[i].mean));
  }
  return p;
}

TakeVerdict SweptReading::read(Curves& out) {
  TakeVerdict verdict;
  if (fundamentals_.size() <= kSlopeSteps) return verdict;  // no row fits below this rate
  const int orders = spec_.settings.orders;
  const SweepScatter scatter = scatter_of(take_.response, orders);
  verdict.settled = scatter.settled();
  verdict.clipped = reaches_full_scale(take_.response, hold_);
  if (!verdict.settled) take_flag_ = Flag::unsteady;
  if (verdict.clipped) take_flag_ = Flag::clipped;

  const SweepResponses responses(sweep_, mean_block(take_.response, hold_, scatter.first()), rate_);
  for (int n = 1; n <= orders; ++n) orders_.push_back(order_of(responses, scatter, n));
  if (take_.reference != nullptr) {
    const SweepResponses driven(sweep_, mean_block(*take_.reference, hold_, scatter.first()),
                                rate_);
    reference_ = order_of(driven, scatter_of(*take_.reference, 1), 1);
    const bool silent = std::any_of(reference_.begin(), reference_.end(),
                                    [](const Line& l) { return !(std::abs(l.mean) > 0.0); });
    if (silent) reference_.clear();
  }
  read_speed();

  std::vector<std::vector<double>> floors;
  for (std::size_t i = 0; i < orders_.front().size(); ++i) floors.push_back(floor_at(i));
  for (int n = 1; n <= orders; ++n) {
    for (std::size_t i = kSlopeSteps; at(n, i) != nullptr; ++i) {
      const double floor = floors[i].empty() ? 0.0 : floors[i][static_cast<std::size_t>(n)];
      out.responses.push_back(row(n, i, floor));
    }
  }
  return verdict;
}

TakeVerdict read(const TakeSpec& spec, const TakeData& take, const RigView& rig, Curves& out) {
  return SweptReading(spec, take, rig).read(out);
}

}  // namespace

std::vector<Hertz> swept_fundamentals(Hertz usable_rate) {
  return fundamentals_from(kLowestRow, usable_rate);
}

Method swept_sine() {
  return {"sweep",
          "swept sine",
          "Farina, AES 108th convention, 2000; Novak, Lotton & Simon, JAES 63(10), 2015",
          Placement::every_rung,
          {.id = "sweep", .duration = true},
          first_hold_blocks,
          block_length,
          stimulus,
          read,
          nullptr};
}

}  // namespace kneeprint
