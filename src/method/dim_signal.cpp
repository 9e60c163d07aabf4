// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/dim_signal.h"

#include <boost/math/distributions/chi_squared.hpp>
#include <cmath>
#include <numbers>

namespace kneeprint {

std::array<ProductIndex, 9> dim_products() {
  std::array<ProductIndex, 9> out;
  for (int k = 1; k <= 9; ++k) {
    const bool below = k * kDimSquare.value() < kDimSine.value();
    out[static_cast<std::size_t>(k) - 1] = below ? ProductIndex{-k, 1} : ProductIndex{k, -1};
  }
  return out;
}

std::complex<double> square_harmonic(int n, Hertz fundamental, Hertz pole) {
  if (n % 2 == 0) return 0.0;
  const std::complex<double> sine(0.0, -4.0 / (std::numbers::pi * n));
  return sine / std::complex<double>(1.0, n * fundamental.value() / pole.value());
}

double steepest_slope(Hertz fundamental, Hertz pole) {
  const double tau = 1.0 / (2.0 * std::numbers::pi * pole.value());
  return (1.0 + std::tanh(period(fundamental).value() / (4.0 * tau))) / tau;
}

RelativeReading dim_figure(std::span<const Line> products,
                           std::span<const RelativeReading> readings, const Line& sine) {
  double power = 0.0, noise = 0.0;
  for (const Line& l : products) {
    power += std::norm(l.mean);
    noise += 2.0 * l.u * l.u;
  }
  const double dof = 2.0 * static_cast<double>(products.size());
  const double most = boost::math::quantile(boost::math::chi_squared(dof), 0.95) / dof;
  if (power > most * noise) return root_sum_of(readings);
  std::vector<RelativeReading> limits(readings.begin(), readings.end());
  for (std::size_t i = 0; i < limits.size(); ++i) {
    limits[i].flag = Flag::noise;
    limits[i].ratio =
        amplitude_upper_limit(std::abs(products[i].mean), products[i].u) / std::abs(sine.mean);
  }
  return root_sum_of(limits);
}

}  // namespace kneeprint
