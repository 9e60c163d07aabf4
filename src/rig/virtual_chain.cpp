// SPDX-License-Identifier: GPL-3.0-or-later
#include "rig/virtual_chain.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numbers>

#include "quantity/failure.h"

namespace kneeprint {
namespace {

constexpr std::size_t kSlice =
    32;  // frames at a time: the oversampled block stays in the nearest cache
constexpr double kQuantum = 1.0 / 8388608.0;  // 24 bits over -1 .. 1
constexpr std::size_t kLagrangeTaps = 8;
constexpr std::size_t kLagrangeLead = 3;  // whole samples by which the taps look ahead

enum class Stream : std::uint64_t { hidden = 1, send, ret, reference };

// splitmix64 (Steele, Lea & Flood, OOPSLA 2014): neighbouring seeds give unrelated streams.
std::uint64_t mix(std::uint64_t x) {
  x += 0x9e3779b97f4a7c15u;
  x = (x ^ (x >> 30)) * 0xbf58476d1ce4e5b9u;
  x = (x ^ (x >> 27)) * 0x94d049bb133111ebu;
  return x ^ (x >> 31);
}
std::uint64_t stream_seed(std::uint64_t seed, Stream stream, int take) {
  const auto number = static_cast<std::uint64_t>(static_cast<std::int64_t>(take));
  return mix(mix(mix(seed) + static_cast<std::uint64_t>(stream)) + number);
}

int checked_oversampling(const VirtualRigName& name, Hertz rate) {
  if (!(rate.value() >= 8000.0 && rate.value() <= 192000.0)) {
    throw UsageError(
        fmt::format("virtual rig: sample rate {} Hz is outside 8000 to 192000 Hz", rate.value()));
  }
  return oversampling_at(virtual_unit(name.unit), rate);
}

}  // namespace

OversampledDelay::OversampledDelay(double samples)
    : whole_(static_cast<std::size_t>(samples)), history_(whole_) {
  const double fraction = samples - static_cast<double>(whole_);
  if (fraction > 0.0) {
    whole_ -= kLagrangeLead;
    history_ = whole_ + kLagrangeTaps - 1;
    // Lagrange's formula: tap k weighs the sample k behind, read at kLagrangeLead + fraction
    // behind.
    const double at = kLagrangeLead + fraction;
    for (std::size_t k = 0; k < kLagrangeTaps; ++k) {
      double weight = 1.0;
      for (std::size_t j = 0; j < kLagrangeTaps; ++j) {
        const double node = static_cast<double>(j);
        if (j != k) weight *= (at - node) / (static_cast<double>(k) - node);
      }
      taps_.push_back(weight);
    }
  }
  buffer_.assign(history_, 0.0);
}

void OversampledDelay::process(std::span<double> x) {
  if (buffer_.size() < history_ + x.size()) buffer_.resize(history_ + x.size());
  const auto newest = buffer_.begin() + static_cast<std::ptrdiff_t>(history_);
  std::copy(x.begin(), x.end(), newest);
  const double* delayed = buffer_.data() + history_ - whole_;
  if (taps_.empty()) {
    std::copy_n(delayed, x.size(), x.begin());
  } else {
    for (std::size_t i = 0; i < x.size(); ++i) {
      double sum = 0.0;
      for (std::size_t k = 0; k < kLagrangeTaps; ++k) sum += taps_[k] * *(delayed + i - k);
      x[i] = sum;
    }
  }
  std::copy_n(buffer_.begin() + static_cast<std::ptrdiff_t>(x.size()), history_, buffer_.begin());
}

ConverterNoise::ConverterNoise(const ConverterModel& model, std::uint64_t seed)
    : noiseless_(model.noiseless),
      quantise_(model.dither_and_quantise && !model.noiseless),
      random_(seed),
      // A level is that of the sine with the same rms: full scale has 1/sqrt 2.
      normal_(0.0, sine_peak(model.noise) / std::numbers::sqrt2) {}

double ConverterNoise::noise() { return noiseless_ ? 0.0 : normal_(random_); }

double ConverterNoise::quantise(double value) {
  if (quantise_) {
    const std::uint64_t bits = random_();
    // Two uniform numbers of 32 bits: their sum less 1 is triangular over +-1 quantum.
    const double dither =
        (static_cast<double>(bits >> 32) + static_cast<double>(bits & 0xffffffffu)) / 4294967296.0 -
        1.0;
    value = std::nearbyint(value / kQuantum + dither) * kQuantum;
  }
  return std::clamp(value, -1.0, 1.0);
}

// Bilinear transform of s / (s + w) with the corner prewarped (Oppenheim & Schafer 2010, 7.2, from
// memory): y[n] = p y[n-1] + g (x[n] - x[n-1]).
Coupling::Coupling(Hertz corner, Hertz rate) {
  const double t = std::tan(std::numbers::pi * (corner / rate));
  pole_ = (1.0 - t) / (1.0 + t);
  gain_ = 1.0 / (1.0 + t);
}

void Coupling::process(std::span<double> x) {
  if (pole_ == 1.0) return;
  for (double& v : x) {
    y_ = pole_ * y_ + gain_ * (v - before_);
    before_ = v;
    v = y_;
  }
}

int oversampling_at(const UnitRecord& unit, Hertz rate) {
  const double wanted = unit.oversampling * 48000.0 / rate.value();
  return std::max(16, 1 << static_cast<int>(std::lround(std::log2(wanted))));
}

VirtualChain::VirtualChain(const VirtualRigName& name, Hertz rate, std::uint64_t seed,
                           const ConverterModel& model, int take, std::size_t buffer)
    : model_(model),
      full_scale_peak_(sine_peak(model.full_scale).value()),
      // H2/H1 = square A/2 and H3/H1 = cube A^2/4 at the full-scale peak A, small terms left out.
      square_(2.0 * model.second_harmonic.ratio() / full_scale_peak_),
      cube_(4.0 * model.third_harmonic.ratio() / (full_scale_peak_ * full_scale_peak_)),
      factor_(checked_oversampling(name, rate)),
      interpolator_(factor_),
      send_coupling_(model.send_coupling, rate * factor_),
      unit_(virtual_unit(name.unit).make(name.settings, rate * factor_)),
      send_noise_(model, stream_seed(seed, Stream::send, take)) {
  boost::random::mt19937_64 hidden(stream_seed(seed, Stream::hidden, 0));
  boost::random::normal_distribution<double> standard;
  const auto draw = [&] {
    const double x = standard(hidden);
    return model_.noiseless ? 0.0 : x * model_.full_scale_u.value();
  };
  const double send_error = draw();
  const double return_error = draw();
  const double reference_error = draw();
  volts_per_sample_ = full_scale_peak_ * Decibels(send_error).ratio();

  // What the filters and the buffer do not already delay: part of a frame at the higher rate, whole
  // frames at the lower. 2^-20 of an oversampled sample is nothing.
  const double filters = static_cast<double>(interpolator_.delay() + Decimator(factor_).delay());
  double high = (model_.latency_samples - static_cast<double>(buffer)) * factor_ - filters;
  high = std::round(high * 1048576.0) / 1048576.0;
  if (!(high >= factor_)) {
    throw UsageError(
        fmt::format("virtual rig: a latency of {} samples is shorter than the {:.2f} that buffer "
                    "and filters need",
                    model_.latency_samples, static_cast<double>(buffer) + filters / factor_ + 1.0));
  }
  const auto coarse = static_cast<std::size_t>(high / factor_) - 1;
  const double fine = high - static_cast<double>(coarse) * factor_;
  returns_.push_back(make_return(rate * factor_, stream_seed(seed, Stream::ret, take), return_error,
                                 fine, coarse));
  if (model_.reference) {
    returns_.push_back(make_return(rate * factor_, stream_seed(seed, Stream::reference, take),
                                   reference_error, fine, coarse));
  }
}

VirtualChain::Return VirtualChain::make_return(Hertz high_rate, std::uint64_t seed,
                                               double gain_error_db, double fine,
                                               std::size_t coarse) const {
  return {1.0 / (full_scale_peak_ * Decibels(gain_error_db).ratio()),
          Coupling(model_.return_coupling, high_rate),
          OversampledDelay(fine),
          Decimator(factor_),
          std::vector<double>(coarse, 0.0),
          0,
          ConverterNoise(model_, seed)};
}

void VirtualChain::distort(std::span<double> volts) const {
  if (model_.noiseless) return;
  for (double& v : volts) v += v * v * (square_ + cube_ * v);
}

void VirtualChain::take_in(Return& path, std::span<double> volts, std::span<float> out) {
  path.coupling.process(volts);
  distort(volts);
  path.fine_delay.process(volts);
  base_.resize(out.size());
  path.decimator.process(volts, base_);
  for (std::size_t i = 0; i < out.size(); ++i) {
    double v = base_[i];
    if (!path.coarse_delay.empty()) {
      std::swap(v, path.coarse_delay[path.coarse_position]);
      path.coarse_position = (path.coarse_position + 1) % path.coarse_delay.size();
    }
    const double sample = v * path.samples_per_volt + path.noise.noise();
    out[i] = static_cast<float>(path.noise.quantise(std::clamp(sample, -1.0, 1.0)));
  }
}

void VirtualChain::process(std::span<const float> sent, std::span<float> returned,
                           std::span<float> reference) {
  for (std::size_t start = 0; start < sent.size(); start += kSlice) {
    const std::size_t count = std::min(kSlice, sent.size() - start);
    base_.resize(count);
    for (std::size_t i = 0; i < count; ++i) {
      const double code = send_noise_.quantise(static_cast<double>(sent[start + i]));
      base_[i] = volts_per_sample_ * (code + send_noise_.noise());
    }
    high_.resize(count * static_cast<std::size_t>(factor_));
    interpolator_.process(base_, high_);
    send_coupling_.process(high_);
    distort(high_);
    if (returns_.size() > 1 && !reference.empty()) {
      split_ = high_;
      take_in(returns_[1], split_, reference.subspan(start, count));
    }
    unit_->process(high_);
    take_in(returns_[0], high_, returned.subspan(start, count));
  }
}

}  // namespace kneeprint
