// SPDX-License-Identifier: GPL-3.0-or-later
#include "sigmoid/predict.h"

#include <cmath>
#include <cstddef>
#include <cstdlib>
#include <map>
#include <numbers>

namespace kneeprint {
namespace {

// The integrands are even in every phase, so half a period serves: its trapezoid points are
// theta_k = 2 pi k / points for k = 0 .. points/2, the two ends counting half.
struct HalfPeriod {
  explicit HalfPeriod(int count) : points(count), size(static_cast<std::size_t>(count) / 2 + 1) {}

  double weight(std::size_t k) const { return (k == 0 || k + 1 == size ? 1.0 : 2.0) / points; }
  double cosine(int n, std::size_t k) const {
    const std::size_t turned = static_cast<std::size_t>(std::abs(n)) * k % period();
    return std::cos(2.0 * std::numbers::pi * static_cast<double>(turned) / points);
  }
  std::size_t period() const { return static_cast<std::size_t>(points); }

  int points;
  std::size_t size;
};

// weight * cos(n theta_k), for every k.
std::vector<double> weighted_cosines(const HalfPeriod& half, int n) {
  std::vector<double> row(half.size);
  for (std::size_t k = 0; k < half.size; ++k) row[k] = half.weight(k) * half.cosine(n, k);
  return row;
}

double dot(const std::vector<double>& a, const std::vector<double>& b) {
  double sum = 0.0;
  for (std::size_t k = 0; k < a.size(); ++k) sum += a[k] * b[k];
  return sum;
}

}  // namespace

std::vector<double> sine_harmonics(const std::function<double(double)>& curve, double amplitude,
                                   int orders, int points) {
  const HalfPeriod half(points);
  std::vector<double> y(half.size);
  for (std::size_t k = 0; k < half.size; ++k) y[k] = curve(amplitude * half.cosine(1, k));
  std::vector<double> h;
  for (int n = 0; n <= orders; ++n) {
    h.push_back((n == 0 ? 1.0 : 2.0) * dot(weighted_cosines(half, n), y));
  }
  return h;
}

std::vector<double> two_tone_products(const std::function<double(double)>& curve, double u1,
                                      double u2, const std::vector<std::pair<int, int>>& products,
                                      int points) {
  const HalfPeriod half(points);
  std::map<int, std::vector<double>> rows;
  for (const auto& [k1, k2] : products) {
    for (const int k : {k1, k2}) rows.try_emplace(k, weighted_cosines(half, k));
  }
  std::vector<double> first(half.size);
  for (std::size_t i = 0; i < half.size; ++i) first[i] = half.cosine(1, i);

  // y is even in a and in b, so of cos(k1 a + k2 b) only cos(k1 a) cos(k2 b) has a mean with it.
  std::vector<double> amplitudes(products.size(), 0.0), y(half.size);
  for (std::size_t i = 0; i < half.size; ++i) {
    for (std::size_t j = 0; j < half.size; ++j) y[j] = curve(u1 * first[i] + u2 * first[j]);
    for (std::size_t q = 0; q < products.size(); ++q) {
      const auto [k1, k2] = products[q];
      amplitudes[q] += 2.0 * rows.at(k1)[i] * dot(rows.at(k2), y);
    }
  }
  return amplitudes;
}

}  // namespace kneeprint
