// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/noise_spectrum.h"

#include <algorithm>
#include <cmath>
#include <stdexcept>

#include "signal/fft.h"
#include "signal/window.h"

namespace kneeprint {

NoiseSpectrum::NoiseSpectrum(const Waveform& x, Seconds segment) {
  const std::size_t size = samples_in(segment, x.rate), hop = size / 2;
  if (x.samples.size() < size || hop == 0) {
    throw std::invalid_argument("a noise spectrum needs one whole segment");
  }
  bin_hz_ = x.rate.value() / static_cast<double>(size);
  const std::vector<double> w = sample(window("hann"), size);
  double squares = 0.0;
  for (const double v : w) squares += v * v;
  scale_ = 2.0 / (x.rate.value() * squares);
  density_.assign(size / 2 + 1, 0.0);
  std::vector<double> cut(size);
  for (std::size_t start = 0; start + size <= x.samples.size(); start += hop) {
    for (std::size_t n = 0; n < size; ++n) cut[n] = w[n] * x.samples[start + n];
    spectra_.push_back(forward_fft(cut));
  }
  for (std::size_t k = 0; k < density_.size(); ++k) {
    for (int m = 0; m < segments(); ++m) density_[k] += density(m, k) / segments();
  }
}

double NoiseSpectrum::density(int segment, std::size_t bin) const {
  return scale_ * std::norm(at(segment, bin));
}

double NoiseSpectrum::effective_segments() const {
  const double m = segments();
  return m / (1.0 + 2.0 / 36.0 * (m - 1.0) / m);
}

NoiseSpectrum::Level NoiseSpectrum::around(std::size_t bin, std::size_t nearest,
                                           std::size_t farthest) const {
  std::vector<double> found;
  const auto top = static_cast<long>(bins()) - 2;  // the last bin may be half the rate
  for (const long side : {-1L, 1L}) {
    for (auto away = static_cast<long>(nearest); away <= static_cast<long>(farthest); ++away) {
      if (away == 0 && side > 0) continue;  // the bin itself counts once
      const long k = static_cast<long>(bin) + side * away;
      if (k >= 1 && k <= top) found.push_back(density_[static_cast<std::size_t>(k)]);
    }
  }
  if (found.empty()) return {};
  const auto middle = found.begin() + static_cast<long>(found.size() / 2);
  std::nth_element(found.begin(), middle, found.end());
  // Median over mean of chi-square with 2 M degrees of freedom (Wilson & Hilferty 1931).
  const double dof = 2.0 * effective_segments();
  const double median = std::pow(1.0 - 2.0 / (9.0 * dof), 3.0);
  // A median keeps 2 / pi of the information of Gaussian data (Kendall & Stuart vol. 1, from
  // memory); neighbouring bins of a Hann window share (2/3)^2 of their power's noise, next ones
  // (1/6)^2.
  constexpr double kEfficiency = 0.637, kOwn = 1.0 / (1.0 + 2.0 * (4.0 / 9.0 + 1.0 / 36.0));
  return {*middle / median, kEfficiency * kOwn * dof * static_cast<double>(found.size())};
}

}  // namespace kneeprint
