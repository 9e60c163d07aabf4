// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/delay.h"

#include <algorithm>
#include <boost/math/tools/minima.hpp>
#include <cmath>
#include <complex>
#include <numbers>
#include <vector>

#include "signal/fft.h"

namespace kneeprint {

Delay find_delay(std::span<const double> known, std::span<const double> recording, long earliest,
                 long latest) {
  // Cross-correlation r[m] = sum_n known[n] recording[n + m] by one product of spectra, zero-padded so
  // that nothing wraps round.
  const std::size_t size = fast_length(known.size() + recording.size());
  const auto padded = [&](std::span<const double> x) {
    std::vector<double> y(size, 0.0);
    std::copy(x.begin(), x.end(), y.begin());
    return forward_fft(y);
  };
  const auto a = padded(known), b = padded(recording);
  std::vector<std::complex<double>> product(a.size());
  for (std::size_t k = 0; k < a.size(); ++k) product[k] = std::conj(a[k]) * b[k];
  const std::vector<double> correlation = inverse_fft(product, size);
  const auto at = [&](long m) {
    return correlation[static_cast<std::size_t>(m < 0 ? m + static_cast<long>(size) : m)];
  };
  long best = earliest;
  for (long m = earliest; m <= latest; ++m) {
    if (std::abs(at(m)) > std::abs(at(best))) best = m;
  }
  // The correlation is band-limited: its values between samples are the inverse transform taken there.
  const double sign = at(best) < 0.0 ? -1.0 : 1.0;
  const auto between = [&](double m) {
    std::complex<double> sum = 0.5 * product[0];
    const std::complex<double> step =
        std::polar(1.0, 2.0 * std::numbers::pi * m / static_cast<double>(size));
    std::complex<double> turn = 1.0;
    for (std::size_t k = 1; k < product.size(); ++k) {
      // The running product loses digits slowly; a fresh start every 1024 steps keeps it exact.
      turn = k % 1024 == 0
                 ? std::polar(1.0, 2.0 * std::numbers::pi * m * static_cast<double>(k) /
                                       static_cast<double>(size))
                 : turn * step;
      sum += product[k] * turn;
    }
    return 2.0 * sum.real() / static_cast<double>(size);
  };
  const auto [where, negative] = boost::math::tools::brent_find_minima(
      [&](double m) { return -sign * between(m); }, static_cast<double>(best) - 1.0,
      static_cast<double>(best) + 1.0, 26);
  const double peak = -sign * negative;

  double known_energy = 0.0, heard_energy = 0.0;
  for (const double x : known) known_energy += x * x;
  const long from = std::lround(where);
  for (long n = std::max(0L, from);
       n < std::min(static_cast<long>(recording.size()), from + static_cast<long>(known.size())); ++n) {
    const double x = recording[static_cast<std::size_t>(n)];
    heard_energy += x * x;
  }
  Delay d;
  d.samples = where;
  d.gain = known_energy > 0.0 ? peak / known_energy : 0.0;
  const double norm = std::sqrt(known_energy * heard_energy);
  d.match = norm > 0.0 ? std::min(1.0, std::abs(peak) / norm) : 0.0;
  return d;
}

}  // namespace kneeprint
