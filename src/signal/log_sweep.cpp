// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/log_sweep.h"

#include <cmath>
#include <numbers>
#include <span>
#include <stdexcept>

#include "signal/smooth_step.h"

namespace kneeprint {

LogSweep::LogSweep(Hertz start, Hertz fall, Hertz stop, Seconds duration)
    : start_(start), fall_(fall), stop_(stop), duration_(duration) {
  if (!(start.value() > 0.0) || !(2.0 * start <= fall) || !(fall < stop) ||
      !(duration.value() > 0.0)) {
    throw std::invalid_argument("a sweep rises over an octave and falls above it, in some time");
  }
  growth_ = duration / std::log(stop / start);
}

double LogSweep::phase(Seconds t) const {
  return 2.0 * std::numbers::pi * cycles(start_, growth_) * std::exp(t / growth_);
}

Seconds LogSweep::time_of(Hertz f) const { return growth_ * std::log(f / start_); }

Seconds LogSweep::lead(int order) const { return growth_ * std::log(static_cast<double>(order)); }

std::vector<double> LogSweep::samples(Hertz rate) const {
  const auto count = static_cast<std::size_t>(std::ceil(duration_.value() * rate.value()));
  std::vector<double> out(count);
  for (std::size_t n = 0; n < count; ++n) {
    out[n] = std::cos(phase(Seconds(static_cast<double>(n) / rate.value())));
  }
  const double rise_samples = time_of(2.0 * start_).value() * rate.value();
  const double fall_samples = (duration_ - time_of(fall_)).value() * rate.value();
  apply_smooth_step(out, 0.0, 1.0 / rise_samples);
  apply_smooth_step(out, duration_.value() * rate.value() / fall_samples, -1.0 / fall_samples);
  return out;
}

std::vector<std::complex<double>> LogSweep::inverse_spectrum(Hertz rate, std::size_t size) const {
  std::vector<std::complex<double>> out(size / 2 + 1);
  const double width = rate.value() / static_cast<double>(size);
  const double growth = growth_.value();
  for (std::size_t k = 1; 2 * k < size; ++k) {
    const double f = static_cast<double>(k) * width;
    if (2.0 * f < start_.value()) continue;
    const double s = 2.0 * std::numbers::pi * f * growth;
    const double angle = s * (1.0 - std::log(f / start_.value())) + std::numbers::pi / 4.0 +
                         1.0 / (12.0 * s) + 1.0 / (360.0 * s * s * s);
    out[k] = std::polar(2.0 * std::sqrt(f / growth) / rate.value(), -angle);
  }
  return out;
}

}  // namespace kneeprint
