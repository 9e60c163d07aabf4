// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/smooth_step.h"

#include <algorithm>
#include <cmath>
#include <complex>
#include <numbers>

#include "signal/window.h"

namespace kneeprint {
namespace {

// The step less its slope is sum_k c_k sin(2 pi k x): the integral of a cosine-sum window.
struct Ripple {
  double c1, c2, c3;
};

Ripple ripple() {
  const auto a = window("blackman-harris-4").coefficients;
  const double scale = 1.0 / (2.0 * std::numbers::pi * a[0]);
  return {-scale * a[1], scale * a[2] / 2.0, -scale * a[3] / 3.0};
}

// sin 2z = 2 s c, sin 3z = s (4 c^2 - 1).
double risen(const Ripple& r, double x, double s, double c) {
  return x + s * (r.c1 + r.c2 * 2.0 * c + r.c3 * (4.0 * c * c - 1.0));
}

}  // namespace

double smooth_step(double x) {
  if (x <= 0.0) return 0.0;
  if (x >= 1.0) return 1.0;
  static const Ripple kRipple = ripple();
  const double z = 2.0 * std::numbers::pi * x;
  return risen(kRipple, x, std::sin(z), std::cos(z));
}

void apply_smooth_step(std::span<double> samples, double x, double dx) {
  static const Ripple kRipple = ripple();
  constexpr std::size_t kRun = 256;  // then the recurrence begins anew: rounding stays under 1e-13
  const std::complex<double> turn = std::polar(1.0, 2.0 * std::numbers::pi * dx);
  for (std::size_t start = 0; start < samples.size(); start += kRun) {
    const std::size_t end = std::min(samples.size(), start + kRun);
    const double first = x + static_cast<double>(start) * dx;
    const double last = x + static_cast<double>(end - 1) * dx;
    if (std::min(first, last) >= 1.0) continue;
    std::complex<double> z = std::polar(1.0, 2.0 * std::numbers::pi * first);
    for (std::size_t i = start; i < end; ++i) {
      const double at = x + static_cast<double>(i) * dx;
      samples[i] *= at <= 0.0 ? 0.0 : at >= 1.0 ? 1.0 : risen(kRipple, at, z.imag(), z.real());
      z = {z.real() * turn.real() - z.imag() * turn.imag(),
           z.real() * turn.imag() + z.imag() * turn.real()};
    }
  }
}

}  // namespace kneeprint
