// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/noise_power.h"

#include <boost/math/distributions/chi_squared.hpp>
#include <cmath>

#include "signal/quasi_peak.h"

namespace kneeprint {
namespace {

constexpr std::size_t kContinuum = 24;  // bins on either side in which the noise is smooth

template <class Value>
std::vector<double> block_means(std::span<const double> x, int blocks, Value value) {
  std::vector<double> means;
  const std::size_t each = x.size() / static_cast<std::size_t>(blocks);
  for (std::size_t start = 0; start + each <= x.size(); start += each) {
    double sum = 0.0;
    for (std::size_t n = start; n < start + each; ++n) sum += value(x[n]);
    means.push_back(sum / static_cast<double>(each));
  }
  return means;
}

}  // namespace

std::vector<double> block_powers(std::span<const double> x, int blocks) {
  return block_means(x, blocks, [](double v) { return v * v; });
}

double gaussian_power_u(const NoiseSpectrum& noise, Weighting weighting, Hertz low, Hertz high,
                        Seconds length) {
  const double dof = 2.0 * noise.effective_segments();
  const double stands_out = boost::math::quantile(boost::math::chi_squared(dof), 0.9999) / dof;
  double integral = 0.0;
  for (std::size_t k = 1; k < noise.bins(); ++k) {
    const Hertz f(static_cast<double>(k) * noise.bin_hz());
    if (f < low || f > high) continue;
    const double g = noise.around(k, 0, kContinuum).density, w = std::norm(weighting(f));
    const double seen = noise.density(k);
    const double line = seen > stands_out * g ? seen - g : 0.0;
    integral += (g + 2.0 * line) * g * w * w * noise.bin_hz();
  }
  return std::sqrt(integral / length.value());
}

Uncertain mean_by_scatter(std::span<const double> parts, double shared) {
  const auto n = static_cast<double>(parts.size());
  double sum = 0.0, squares = 0.0;
  for (const double p : parts) sum += p;
  const double mean = sum / n;
  if (parts.size() < 2) return {mean, 0.0, kInfiniteDof};
  for (const double p : parts) squares += (p - mean) * (p - mean);
  // Of neighbours that share a part of their noise, the scatter shows too little, and the mean
  // keeps too much: both to first order in `shared`.
  const double pairs = 2.0 * shared * (n - 1.0) / n;
  const double variance = squares / (n - 1.0) / n * (1.0 + pairs) / (1.0 - pairs / (n - 1.0));
  return {mean, std::sqrt(variance), n - 1.0};
}

Uncertain mean_power(std::span<const double> parts, double expected_u, double shared) {
  const Uncertain seen = mean_by_scatter(parts, shared);
  if (parts.size() < 2) return {seen.value, expected_u, kInfiniteDof};
  const double limit = boost::math::quantile(boost::math::chi_squared(seen.dof), 0.999) / seen.dof;
  if (seen.u * seen.u <= limit * expected_u * expected_u) {
    return {seen.value, expected_u, kInfiniteDof};
  }
  return seen;
}

Uncertain quasi_peak_reading(std::span<const double> x, Hertz rate, int blocks) {
  QuasiPeakMeter meter(rate);
  for (const double v : x) meter.step(v);
  const auto readings = block_means(x, blocks, [&](double v) { return meter.step(v); });
  // Correlation of neighbouring means over B of what forgets by exp(-t / tau), by integration:
  // with s = tau / B and e = 1 - exp(-1 / s), s^2 e^2 over 2 s (1 - s e).
  const double s = kQuasiPeakMemory.value() * blocks * rate.value() / static_cast<double>(x.size());
  const double e = 1.0 - std::exp(-1.0 / s);
  return mean_by_scatter(readings, s * e * e / (2.0 * (1.0 - s * e)));
}

}  // namespace kneeprint
