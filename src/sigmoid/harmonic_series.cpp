// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/harmonic_series.h"

#include <algorithm>
#include <bit>
#include <cmath>
#include <cstddef>
#include <numbers>

namespace kneeprint {
namespace {

constexpr int kMostPoints = 65536;
constexpr double kRounding = 2e-15;  // sums of numbers up to 1 agree no better than this

}  // namespace

HarmonicSeries::HarmonicSeries(int orders)
    : orders_(static_cast<std::size_t>(orders)),
      width_(orders_ + 2),
      coarsest_(static_cast<int>(std::bit_ceil(width_))),
      value_sums_(width_),
      slope_sums_(width_),
      sharpness_sums_(width_) {}

// The integrand is even in theta, so half a period serves, its two ends counting half. Level 0 holds
// every point of its rule, each further level the odd ones of a rule twice as fine.
const HarmonicSeries::Level& HarmonicSeries::level(std::size_t index) {
  while (levels_.size() <= index) {
    Level l;
    const bool first = levels_.empty();
    const int points = coarsest_ << levels_.size();
    for (int k = first ? 0 : 1; k <= points / 2; k += first ? 1 : 2) {
      l.weights.push_back(k == 0 || k == points / 2 ? 1.0 : 2.0);
      for (std::size_t n = 0; n < width_; ++n) {
        const auto turned = static_cast<int>(n) * k % points;
        l.cosines.push_back(std::cos(2.0 * std::numbers::pi * turned / points));
      }
    }
    levels_.push_back(std::move(l));
  }
  return levels_[index];
}

void HarmonicSeries::add(const SigmoidFamily& family, const SigmoidParameters& p, double amplitude,
                         bool derivatives, const Level& level) {
  const double rest = family.value(p.bias, p.sharpness);
  const double rest_by_sharpness = family.by_sharpness(p.bias, p.sharpness);
  const double swing = p.drive * amplitude;
  for (std::size_t i = 0; i < level.weights.size(); ++i) {
    const double* const cosines = &level.cosines[i * width_];
    const double w = level.weights[i];
    const double z = swing * cosines[1] + p.bias;
    const double value = w * (family.value(z, p.sharpness) - rest);
    for (std::size_t n = 0; n < width_; ++n) value_sums_[n] += value * cosines[n];
    if (!derivatives) continue;
    const double slope = w * family.slope(z, p.sharpness);
    for (std::size_t n = 0; n < width_; ++n) slope_sums_[n] += slope * cosines[n];
    if (!family.has_sharpness) continue;
    const double by_p = w * (family.by_sharpness(z, p.sharpness) - rest_by_sharpness);
    for (std::size_t n = 0; n < width_; ++n) sharpness_sums_[n] += by_p * cosines[n];
  }
}

void HarmonicSeries::evaluate(const SigmoidFamily& family, const SigmoidParameters& p,
                              double amplitude, double tolerance, bool derivatives,
                              HarmonicSet& result) {
  const double wanted =
      std::max(tolerance * std::min(1.0, std::abs(p.drive * amplitude)), kRounding);
  for (auto* sums : {&value_sums_, &slope_sums_, &sharpness_sums_}) {
    std::fill(sums->begin(), sums->end(), 0.0);
  }
  const auto coefficient = [](const std::vector<double>& sums, std::size_t n, int points) {
    return (n == 0 ? 1.0 : 2.0) * sums[n] / points;
  };

  result.value.assign(orders_ + 1, 0.0);
  int points = coarsest_;
  for (std::size_t index = 0;; ++index, points *= 2) {
    add(family, p, amplitude, derivatives, level(index));
    double change = 0.0;
    for (std::size_t n = 0; n <= orders_; ++n) {
      const double h = coefficient(value_sums_, n, points);
      change = std::max(change, std::abs(h - result.value[n]));
      result.value[n] = h;
    }
    if ((index > 0 && change <= wanted) || points >= kMostPoints) break;
  }
  if (!derivatives) return;

  result.by_drive.resize(orders_ + 1);
  result.by_bias.resize(orders_ + 1);
  result.by_sharpness.resize(orders_ + 1);
  const double rest_slope = family.slope(p.bias, p.sharpness);
  for (std::size_t n = 0; n <= orders_; ++n) {
    // G_n, the coefficients of S': cos(n theta) cos(theta) folds into orders n-1 and n+1.
    const auto g = [&](std::size_t m) { return coefficient(slope_sums_, m, points); };
    const double folded = n == 0   ? 0.5 * g(1)
                          : n == 1 ? g(0) + 0.5 * g(2)
                                   : 0.5 * (g(n - 1) + g(n + 1));
    result.by_drive[n] = amplitude * folded;
    result.by_bias[n] = g(n) - (n == 0 ? rest_slope : 0.0);
    result.by_sharpness[n] = coefficient(sharpness_sums_, n, points);
  }
}

}  // namespace kneeprint
