// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/harmonic_series.h"

#include <algorithm>
#include <bit>
#include <cmath>
#include <limits>
#include <numbers>
#include <utility>

namespace kneeprint {
namespace {

constexpr int kQuickPoints = 256;  // per period: where the trapezoid rule gives way to Gauss's
constexpr int kMostPoints = 65536;
constexpr std::size_t kFewestNodes = 16, kMostNodes = 1024;
constexpr double kRounding = 2e-15;  // sums of numbers up to 1 agree no better than this

double coefficient(const std::vector<double>& sums, std::size_t n, double scale) {
  return (n == 0 ? 1.0 : 2.0) * scale * sums[n];
}

}  // namespace

HarmonicSeries::HarmonicSeries(int orders)
    : orders_(static_cast<std::size_t>(orders)),
      width_(orders_ + 2),
      coarsest_(static_cast<int>(std::bit_ceil(width_))),
      value_sums_(width_),
      slope_sums_(width_),
      sharpness_sums_(width_),
      value_(orders_ + 1) {}

// The integrand is even in theta, so half a period serves, its two ends counting half. The first
// rule holds every point, each doubling adds the odd ones of a rule twice as fine.
const HarmonicSeries::Points& HarmonicSeries::trapezoid_points(std::size_t doublings) {
  while (trapezoids_.size() <= doublings) {
    Points added;
    const bool first = trapezoids_.empty();
    const int points = coarsest_ << trapezoids_.size();
    for (int k = first ? 0 : 1; k <= points / 2; k += first ? 1 : 2) {
      added.weights.push_back(k == 0 || k == points / 2 ? 1.0 : 2.0);
      for (std::size_t n = 0; n < width_; ++n) {
        const std::size_t turned =
            n * static_cast<std::size_t>(k) % static_cast<std::size_t>(points);
        added.cosines.push_back(
            std::cos(2.0 * std::numbers::pi * static_cast<double>(turned) / points));
      }
    }
    trapezoids_.push_back(std::move(added));
  }
  return trapezoids_[doublings];
}

// Roots of P_N by Newton's method from cos(pi (i + 3/4) / (N + 1/2)), weights 2 / ((1 - x^2)
// P_N'^2): Abramowitz & Stegun (1964) 25.4.29 and 22.16.6 (numbers from memory).
const HarmonicSeries::GaussRule& HarmonicSeries::gauss_rule(std::size_t doublings) {
  while (rules_.size() <= doublings) {
    const std::size_t size = kFewestNodes << rules_.size();
    const auto n = static_cast<double>(size);
    GaussRule rule;
    for (std::size_t i = 0; i < size; ++i) {
      double x = std::cos(std::numbers::pi * (static_cast<double>(i) + 0.75) / (n + 0.5));
      double slope = 0.0;
      for (int iteration = 0; iteration < 6; ++iteration) {
        double before = 1.0, legendre = x;
        for (std::size_t m = 2; m <= size; ++m) {
          const auto order = static_cast<double>(m);
          const double next = ((2.0 * order - 1.0) * x * legendre - (order - 1.0) * before) / order;
          before = legendre;
          legendre = next;
        }
        slope = n * (x * legendre - before) / (x * x - 1.0);
        const double step = legendre / slope;
        x -= step;
        if (std::abs(step) < std::numeric_limits<double>::epsilon()) break;
      }
      rule.nodes.push_back(x);
      rule.weights.push_back(2.0 / ((1.0 - x * x) * slope * slope));
    }
    rules_.push_back(std::move(rule));
  }
  return rules_[doublings];
}

void HarmonicSeries::place_gauss_points(const GaussRule& rule, double crossing) {
  gauss_points_.weights.clear();
  gauss_points_.cosines.clear();
  for (const auto& [from, to] : {std::pair{0.0, crossing}, std::pair{crossing, std::numbers::pi}}) {
    const double half = 0.5 * (to - from);
    for (std::size_t i = 0; i < rule.nodes.size(); ++i) {
      gauss_points_.weights.push_back(half * rule.weights[i] / std::numbers::pi);
      const double c = std::cos(0.5 * (from + to) + half * rule.nodes[i]);
      double before = c, now = 1.0;  // cos(-theta), cos(0)
      for (std::size_t n = 0; n < width_; ++n) {
        gauss_points_.cosines.push_back(now);
        const double next = 2.0 * c * now - before;
        before = now;
        now = next;
      }
    }
  }
}

void HarmonicSeries::add_values(const Curve& curve, const Points& points) {
  const auto& [family, p, swing] = curve;
  const double rest = family.value(p.bias, p.sharpness);
  for (std::size_t i = 0; i < points.weights.size(); ++i) {
    const double* const cosines = &points.cosines[i * width_];
    const double value =
        points.weights[i] * (family.value(swing * cosines[1] + p.bias, p.sharpness) - rest);
    for (std::size_t n = 0; n < width_; ++n) value_sums_[n] += value * cosines[n];
  }
}

void HarmonicSeries::add_derivatives(const Curve& curve, const Points& points) {
  const auto& [family, p, swing] = curve;
  const double rest = family.by_sharpness(p.bias, p.sharpness);
  for (std::size_t i = 0; i < points.weights.size(); ++i) {
    const double* const cosines = &points.cosines[i * width_];
    const double z = swing * cosines[1] + p.bias;
    const double slope = points.weights[i] * family.slope(z, p.sharpness);
    for (std::size_t n = 0; n < width_; ++n) slope_sums_[n] += slope * cosines[n];
    if (!family.has_sharpness) continue;
    const double by_p = points.weights[i] * (family.by_sharpness(z, p.sharpness) - rest);
    for (std::size_t n = 0; n < width_; ++n) sharpness_sums_[n] += by_p * cosines[n];
  }
}

double HarmonicSeries::update(double scale) {
  double change = 0.0;
  for (std::size_t n = 0; n <= orders_; ++n) {
    const double h = coefficient(value_sums_, n, scale);
    change = std::max(change, std::abs(h - value_[n]));
    value_[n] = h;
  }
  return change;
}

bool HarmonicSeries::by_trapezoid(const Curve& curve, double wanted, int most_points) {
  std::fill(value_sums_.begin(), value_sums_.end(), 0.0);
  for (used_trapezoids_ = 1;; ++used_trapezoids_) {
    const int points = coarsest_ << (used_trapezoids_ - 1);
    add_values(curve, trapezoid_points(used_trapezoids_ - 1));
    const bool settled = update(1.0 / points) <= wanted && used_trapezoids_ > 1;
    if (settled || points >= most_points) return settled;
  }
}

void HarmonicSeries::by_gauss(const Curve& curve, double wanted) {
  const double crossing = std::acos(-curve.p.bias / curve.swing);
  for (std::size_t doublings = 0;; ++doublings) {
    const GaussRule& rule = gauss_rule(doublings);
    place_gauss_points(rule, crossing);
    std::fill(value_sums_.begin(), value_sums_.end(), 0.0);
    add_values(curve, gauss_points_);
    const bool settled = update(1.0) <= wanted && doublings > 0;
    if (settled || rule.nodes.size() >= kMostNodes) return;
  }
}

void HarmonicSeries::evaluate(const SigmoidFamily& family, const SigmoidParameters& p,
                              double amplitude, double tolerance, bool derivatives,
                              HarmonicSet& result) {
  const Curve curve{family, p, p.drive * amplitude};
  const double wanted = std::max(tolerance * std::min(1.0, std::abs(curve.swing)), kRounding);
  std::fill(slope_sums_.begin(), slope_sums_.end(), 0.0);
  std::fill(sharpness_sums_.begin(), sharpness_sums_.end(), 0.0);

  const bool crossed = std::abs(p.bias) < std::abs(curve.swing);
  const bool quick = by_trapezoid(curve, wanted, crossed ? kQuickPoints : kMostPoints);
  double scale = 1.0;
  if (crossed && !quick) {
    by_gauss(curve, wanted);
    if (derivatives) add_derivatives(curve, gauss_points_);
  } else if (derivatives) {
    for (std::size_t i = 0; i < used_trapezoids_; ++i) add_derivatives(curve, trapezoids_[i]);
    scale = 1.0 / (coarsest_ << (used_trapezoids_ - 1));
  }
  result.value = value_;
  if (!derivatives) return;

  result.by_drive.resize(orders_ + 1);
  result.by_bias.resize(orders_ + 1);
  result.by_sharpness.resize(orders_ + 1);
  const double rest_slope = family.slope(p.bias, p.sharpness);
  for (std::size_t n = 0; n <= orders_; ++n) {
    // G_n, the coefficients of S': cos(n theta) cos(theta) folds into orders n-1 and n+1.
    const auto g = [&](std::size_t m) { return coefficient(slope_sums_, m, scale); };
    const double folded = n == 0   ? 0.5 * g(1)
                          : n == 1 ? g(0) + 0.5 * g(2)
                                   : 0.5 * (g(n - 1) + g(n + 1));
    result.by_drive[n] = amplitude * folded;
    result.by_bias[n] = g(n) - (n == 0 ? rest_slope : 0.0);
    result.by_sharpness[n] = coefficient(sharpness_sums_, n, scale);
  }
}

}  // namespace kneeprint
