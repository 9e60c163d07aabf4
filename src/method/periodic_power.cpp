// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/periodic_power.h"

#include <algorithm>
#include <array>
#include <boost/math/distributions/fisher_f.hpp>
#include <cmath>
#include <numbers>

namespace kneeprint {
namespace {

constexpr double kOneSided95 = 1.6448536269514722;
constexpr double kDbPerRelativePower = 10.0 / std::numbers::ln10;

}  // namespace

void PeriodicPower::add(std::span<const std::complex<double>> bin) {
  const auto m = static_cast<double>(bin.size());
  std::complex<double> sum = 0.0;
  for (const auto& z : bin) sum += z;
  const std::complex<double> mean = sum / m;
  double scatter = 0.0;
  for (const auto& z : bin) scatter += std::norm(z - mean);
  blocks_ = static_cast<int>(bin.size());
  open_raw_ += 0.5 * std::norm(mean);
  open_noise_ += 0.5 * scatter / (m - 1.0) / m;
  ++open_bins_;
}

void PeriodicPower::close_group() {
  if (open_bins_ == 0) return;
  raw_ += open_raw_;
  noise_in_mean_ += open_noise_;
  squares_ += open_noise_ * open_noise_ / open_bins_;
  cross_ += 2.0 * open_noise_ / open_bins_ * std::max(0.0, open_raw_ - open_noise_);
  open_raw_ = open_noise_ = 0.0;
  open_bins_ = 0;
}

PeriodicPower& PeriodicPower::operator+=(const PeriodicPower& other) {
  blocks_ = std::max(blocks_, other.blocks_);
  raw_ += other.raw_;
  noise_in_mean_ += other.noise_in_mean_;
  squares_ += other.squares_;
  cross_ += other.cross_;
  return *this;
}

double PeriodicPower::noise_per_bin() const {
  return noise_in_mean_ > 0.0 ? squares_ / noise_in_mean_ : 0.0;
}

double PeriodicPower::effective_bins() const {
  return squares_ > 0.0 ? noise_in_mean_ * noise_in_mean_ / squares_ : 0.0;
}

double PeriodicPower::variance_without() const {
  return squares_ > 0.0 ? squares_ * blocks_ / (blocks_ - 1.0) : 0.0;
}

Uncertain PeriodicPower::periodic() const {
  const double value = raw_ - noise_in_mean_;
  const double bins = effective_bins();
  return {value, std::sqrt(variance_without() + cross_),
          bins > 0.0 ? 2.0 * bins * (blocks_ - 1.0) : kInfiniteDof};
}

Uncertain PeriodicPower::noise() const {
  const double m = blocks_, bins = effective_bins();
  if (!(bins > 0.0)) return {m * noise_in_mean_, 0.0, kInfiniteDof};
  // Chi-square of 2 n (M - 1) degrees of freedom.
  return {m * noise_in_mean_, m * std::sqrt(squares_ / (m - 1.0)), 2.0 * bins * (m - 1.0)};
}

Uncertain PeriodicPower::total() const {
  // The mean of the blocks' powers is raw + (M - 1) sum v; its two parts are independent.
  const Uncertain p = periodic();
  if (!(noise_in_mean_ > 0.0)) return p;
  const double m = blocks_;
  const double of_raw = squares_ + cross_;
  const double of_scatter = (m - 1.0) * squares_;
  return {raw_ + (m - 1.0) * noise_in_mean_, std::sqrt(of_raw + of_scatter), p.dof};
}

bool PeriodicPower::seen(double chance) const {
  if (!(raw_ > 0.0)) return false;
  const double bins = effective_bins();
  if (!(bins > 0.0)) return true;
  const boost::math::fisher_f f(2.0 * bins, 2.0 * bins * (blocks_ - 1.0));
  return raw_ / noise_in_mean_ > boost::math::quantile(boost::math::complement(f, chance));
}

double PeriodicPower::upper_limit() const {
  const double read = raw_ - noise_in_mean_;
  if (!(noise_in_mean_ > 0.0)) return std::max(0.0, read);
  // D - c sqrt(variance(D)) = read, solved for y = sqrt(variance(D)), the variance being linear in
  // D.
  const double none = variance_without(), slope = 2.0 * noise_per_bin();
  const double half = 0.5 * kOneSided95 * slope;
  const double least = kOneSided95 * std::sqrt(none);
  const double inside = half * half + none + slope * read;
  if (inside <= 0.0) return least;
  const double y = half + std::sqrt(inside);
  return std::max(least, (y * y - none) / slope);
}

PowerRatio in_decibels(const Uncertain& power, const Uncertain& reference) {
  if (!(power.value > 0.0)) return {};
  const std::array parts{Contribution{power.u / power.value, power.dof},
                         Contribution{reference.u / reference.value, reference.dof}};
  const Contribution c = combine(parts);
  return {10.0 * std::log10(power.value / reference.value),
          kDbPerRelativePower * coverage_factor_95(c.dof) * c.u};
}

}  // namespace kneeprint
