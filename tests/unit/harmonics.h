// SPDX-License-Identifier: GPL-3.0-or-later
// Direct Fourier sums, for signals that repeat exactly within the span.
#pragma once

#include <cmath>
#include <complex>
#include <functional>
#include <numbers>
#include <span>
#include <vector>

/// Complex amplitude of `cycles` per span: a cos + b sin -> a - jb; dc itself for 0.
inline std::complex<double> line(std::span<const double> x, std::size_t cycles) {
  std::complex<double> sum = 0.0;
  const std::size_t size = x.size();
  for (std::size_t n = 0; n < size; ++n) {
    const double angle = -2.0 * std::numbers::pi * static_cast<double>(cycles * n % size) /
                         static_cast<double>(size);
    sum += x[n] * std::polar(1.0, angle);
  }
  return sum * ((cycles == 0 ? 1.0 : 2.0) / static_cast<double>(size));
}

/// H_n of f(offset + amplitude cos theta), signed peak amplitudes, by a sum over one period.
inline double harmonic(const std::function<double(double)>& f, double offset, double amplitude,
                       std::size_t order, std::size_t points = 1024) {
  std::vector<double> y(points);
  for (std::size_t n = 0; n < points; ++n) {
    y[n] = f(offset + amplitude * std::cos(2.0 * std::numbers::pi * static_cast<double>(n) /
                                           static_cast<double>(points)));
  }
  return line(y, order).real();
}
