// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/sweep_responses.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <memory>
#include <mutex>
#include <numbers>

#include "signal/fft.h"
#include "signal/smooth_step.h"

namespace kneeprint {
namespace {

constexpr double kPeriodsBefore = 10.0, kPeriodsAfter = 20.0;
constexpr double kLeastBefore = 0.008, kLeastAfter = 0.020;  // s
// The converters' and the sweep's own upper edges ring by samples, not by milliseconds.
constexpr double kSamplesBefore = 384.0, kSamplesAfter = 960.0;
// Of the way to the next order's instant: its own response rings on towards this one.
constexpr double kShareBefore = 0.45;
constexpr double kShareAfter = 0.70;
constexpr double kStepShare = 0.6;  // of each side is the window's step, the rest is flat

struct Extent {
  double before, after;  // s, about the order's instant
};

Extent extent_of(int order, double frequency, const LogSweep& sweep, Hertz rate) {
  Extent w{std::max({kLeastBefore, kSamplesBefore / rate.value(), kPeriodsBefore / frequency}),
           std::max({kLeastAfter, kSamplesAfter / rate.value(), kPeriodsAfter / frequency})};
  const double to_next = (sweep.lead(order + 1) - sweep.lead(order)).value();
  w.before = std::min(w.before, kShareBefore * to_next);
  if (order > 1) {
    const double to_previous = (sweep.lead(order) - sweep.lead(order - 1)).value();
    w.after = std::min(w.after, kShareAfter * to_previous);
  }
  return w;
}

// sum_i x[i] exp(-j angle i): eight oscillators side by side, so that none waits for itself.
std::complex<double> line(std::span<const double> x, double angle) {
  constexpr std::size_t kLanes = 8;
  std::array<double, kLanes> c, s, re{}, im{};
  for (std::size_t l = 0; l < kLanes; ++l) {
    c[l] = std::cos(angle * static_cast<double>(l));
    s[l] = -std::sin(angle * static_cast<double>(l));
  }
  const double turn_c = std::cos(angle * kLanes), turn_s = -std::sin(angle * kLanes);
  std::size_t i = 0;
  for (; i + kLanes <= x.size(); i += kLanes) {
    for (std::size_t l = 0; l < kLanes; ++l) {
      re[l] += x[i + l] * c[l];
      im[l] += x[i + l] * s[l];
      const double next = c[l] * turn_c - s[l] * turn_s;
      s[l] = c[l] * turn_s + s[l] * turn_c;
      c[l] = next;
    }
  }
  std::complex<double> sum = 0.0;
  for (std::size_t l = 0; l < kLanes; ++l) {
    sum += std::complex(re[l], im[l]);
    if (i + l < x.size()) sum += x[i + l] * std::complex(c[l], s[l]);
  }
  return sum;
}

using Spectrum = std::vector<std::complex<double>>;

// By real and imaginary parts: the compiler's way with complex numbers costs as much as a
// transform.
void multiply(std::complex<double>* spectrum, const Spectrum& by) {
  auto* a = reinterpret_cast<double*>(spectrum);
  const auto* b = reinterpret_cast<const double*>(by.data());
  for (std::size_t k = 0; k < 2 * by.size(); k += 2) {
    const double re = a[k] * b[k] - a[k + 1] * b[k + 1];
    const double im = a[k] * b[k + 1] + a[k + 1] * b[k];
    a[k] = re;
    a[k + 1] = im;
  }
}

// The takes of a plan share one sweep: its inverse, over the transform's length, is kept from one
// to the next.
std::shared_ptr<const Spectrum> inverse_of(const LogSweep& sweep, Hertz rate, std::size_t size) {
  struct Kept {
    std::array<double, 5> key{};
    std::shared_ptr<const Spectrum> inverse;
  };
  static std::mutex mutex;
  static Kept kept;
  const std::array key{sweep.start().value(), sweep.stop().value(), sweep.duration().value(),
                       rate.value(), static_cast<double>(size)};
  const std::scoped_lock lock(mutex);
  if (!kept.inverse || kept.key != key) {
    Spectrum inverse = sweep.inverse_spectrum(rate, size);
    for (auto& z : inverse) z /= static_cast<double>(size);  // of the transform back
    kept = {key, std::make_shared<const Spectrum>(std::move(inverse))};
  }
  return kept.inverse;
}

}  // namespace

SweepResponses::SweepResponses(const LogSweep& sweep, std::span<const double> block, Hertz rate)
    : sweep_(sweep), rate_(rate), size_(block.size()), impulse_(sample_buffer(block.size())) {
  // Arrays of a sweep's length do not fit any cache: each is written once and read once.
  const auto inverse = inverse_of(sweep, rate, size_);
  const SpectrumBuffer spectrum = spectrum_buffer(inverse->size());
  forward_fft(block, spectrum.get());
  multiply(spectrum.get(), *inverse);
  inverse_fft_times_n(spectrum.get(), impulse_.get(), size_);
}

OrderResponse SweepResponses::read(int order, std::span<const Hertz> fundamentals) const {
  OrderResponse out;
  if (fundamentals.empty()) return out;
  const double rate = rate_.value();
  const double middle = std::sqrt(fundamentals.front().value() * fundamentals.back().value());
  const Extent w = extent_of(order, order * middle, sweep_, rate_);
  const double instant = -sweep_.lead(order).value() * rate;  // in samples, not whole
  const auto first = static_cast<long>(std::ceil(instant - w.before * rate));
  const auto last = static_cast<long>(std::floor(instant + w.after * rate));
  const auto period = static_cast<long>(size_);
  std::vector<double> cut(static_cast<std::size_t>(std::max(1L, last - first + 1)));
  auto from_sample = static_cast<std::size_t>(((first % period) + period) % period);
  for (double& x : cut) {
    x = impulse_[from_sample];
    if (++from_sample == size_) from_sample = 0;
  }
  const double rise = kStepShare * w.before * rate, fall = kStepShare * w.after * rate;
  const double from = static_cast<double>(first) - instant + w.before * rate;
  const double to = instant + w.after * rate - static_cast<double>(first);
  apply_smooth_step(cut, from / rise, 1.0 / rise);
  apply_smooth_step(cut, to / fall, -1.0 / fall);
  for (const Hertz f : fundamentals) {
    const double angle = 2.0 * std::numbers::pi * order * f.value() / rate;
    out.gain.push_back(line(cut, angle) *
                       std::polar(1.0, -angle * (static_cast<double>(first) - instant)));
  }
  // A step's square holds 0.42144 of its length (numerical integral of smooth_step squared).
  constexpr double kStepEnergy = 0.42144;
  out.window_energy = Seconds((w.before + w.after) * (1.0 - kStepShare + kStepShare * kStepEnergy));
  return out;
}

}  // namespace kneeprint
