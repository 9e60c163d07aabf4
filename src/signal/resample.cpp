// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/resample.h"

#include <algorithm>
#include <boost/math/special_functions/bessel.hpp>
#include <cmath>
#include <numbers>

namespace kneeprint {
namespace {

// Kaiser's formulas for 150 dB: beta = 0.1102 (A - 8.7); a transition from 0.907 to 1.093 of Nyquist
// wants A / (2.285 * 0.186 pi) = 112 zero crossings either way together (Kaiser 1974, from memory).
constexpr double kBeta = 0.1102 * (150.0 - 8.7);
constexpr int kHalfWidth = 64;       // zero crossings on either side
constexpr int kTablePerCrossing = 2048;  // with cubic interpolation the table's error is under -160 dB

// Windowed sinc at u zero crossings from its centre.
double kernel(double u) {
  const double edge = u / kHalfWidth;
  if (std::abs(edge) >= 1.0) return 0.0;
  const double window = boost::math::cyl_bessel_i(0, kBeta * std::sqrt(1.0 - edge * edge)) /
                        boost::math::cyl_bessel_i(0, kBeta);
  const double x = std::numbers::pi * u;
  return window * (std::abs(x) < 1e-9 ? 1.0 : std::sin(x) / x);
}

// The kernel on a fine grid, one guard point before its centre and some past its end.
const std::vector<double>& table() {
  static const std::vector<double> t = [] {
    std::vector<double> v(static_cast<std::size_t>(kHalfWidth) * kTablePerCrossing + 4);
    for (std::size_t i = 0; i < v.size(); ++i) {
      v[i] = kernel((static_cast<double>(i) - 1.0) / kTablePerCrossing);
    }
    return v;
  }();
  return t;
}

// Cubic (Lagrange, four points) reading of the table; u >= 0.
double read_kernel(const std::vector<double>& t, double u) {
  const double position = u * kTablePerCrossing;
  const auto i = static_cast<std::size_t>(position);
  const double f = position - static_cast<double>(i);
  const double a = t[i], b = t[i + 1], c = t[i + 2], d = t[i + 3];
  const double c0 = b, c1 = c - a / 3.0 - b / 2.0 - d / 6.0, c2 = (a + c) / 2.0 - b,
               c3 = (d - a) / 6.0 + (b - c) / 2.0;
  return ((c3 * f + c2) * f + c1) * f + c0;
}

}  // namespace

std::vector<double> read_at(std::span<const double> x, double start, double step,
                            std::size_t count) {
  const std::vector<double>& t = table();
  // Reading slower than it was sampled would fold: the kernel is stretched so that it passes only what
  // the new rate can hold.
  const double stretch = std::max(1.0, step);
  const double reach = kHalfWidth * stretch;
  std::vector<double> out(count, 0.0);
  for (std::size_t n = 0; n < count; ++n) {
    const double centre = start + static_cast<double>(n) * step;
    const long first = std::max(0L, static_cast<long>(std::ceil(centre - reach)));
    const long last =
        std::min(static_cast<long>(x.size()) - 1, static_cast<long>(std::floor(centre + reach)));
    double sum = 0.0;
    for (long k = first; k <= last; ++k) {
      const double u = std::abs(static_cast<double>(k) - centre) / stretch;
      if (u < kHalfWidth) sum += x[static_cast<std::size_t>(k)] * read_kernel(t, u);
    }
    out[n] = sum / stretch;
  }
  return out;
}

}  // namespace kneeprint
