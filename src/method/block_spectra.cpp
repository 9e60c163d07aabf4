// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/block_spectra.h"

#include <algorithm>
#include <boost/math/distributions/fisher_f.hpp>
#include <boost/math/distributions/non_central_chi_squared.hpp>
#include <cmath>
#include <numbers>

#include "signal/fft.h"

namespace kneeprint {
namespace {

constexpr int kNeighboursEachSide = 24;
// The median of n exponential variates is 48 % efficient for large n (asymptotic variance of the
// median, Kendall & Stuart vol. 1, from memory), which costs that share of the degrees of freedom.
constexpr double kMedianEfficiency = 0.48;
constexpr double kRayleigh95 = 2.4477468307;  // sqrt(-2 ln 0.05)

}  // namespace

BlockSpectra::BlockSpectra(const Waveform& take, const HoldLayout& hold, std::size_t stride,
                           std::size_t emptied)
    : bin_width_(take.rate.value() / static_cast<double>(hold.block)),
      stride_(stride),
      emptied_(emptied) {
  const double scale = 2.0 / static_cast<double>(hold.block);
  for (int k = 0; k < hold.blocks; ++k) {
    const std::size_t start = hold.first_block + hold.block * static_cast<std::size_t>(k);
    auto spectrum = forward_fft(std::span(take.samples).subspan(start, hold.block));
    for (auto& z : spectrum) z *= scale;
    spectrum.front() *= 0.5;
    spectra_.push_back(std::move(spectrum));
  }
}

BlockSpectra::Noise BlockSpectra::noise_around(std::size_t bin, int first) const {
  std::vector<double> powers;
  const auto top =
      static_cast<long>(bins()) - 2;  // the last bin may be Nyquist: real, half the power
  for (int side : {-1, 1}) {
    int taken = 0;
    for (long k = static_cast<long>(bin) + side * (1 + static_cast<long>(emptied_));
         k >= 1 && k <= top && taken < kNeighboursEachSide; k += side) {
      if (k % static_cast<long>(stride_) == 0) continue;
      ++taken;
      for (int b = first; b < blocks(); ++b) {
        powers.push_back(std::norm(at(b, static_cast<std::size_t>(k))));
      }
    }
  }
  if (powers.size() < 8) return {};
  const auto middle = powers.begin() + static_cast<long>(powers.size() / 2);
  std::nth_element(powers.begin(), middle, powers.end());
  // |Z|^2 of Gaussian noise is exponential with mean 2 sigma^2 and median 2 sigma^2 ln 2.
  return {std::sqrt(*middle / (2.0 * std::numbers::ln2)),
          2.0 * kMedianEfficiency * static_cast<double>(powers.size())};
}

Line BlockSpectra::mean(std::size_t bin, int first, const std::function<double(int)>& turn) const {
  const int count = blocks() - first;
  std::vector<std::complex<double>> turned;
  std::complex<double> sum = 0.0;
  for (int b = first; b < blocks(); ++b) {
    turned.push_back(at(b, bin) * std::polar(1.0, -turn(b)));
    sum += turned.back();
  }
  const std::complex<double> average = sum / static_cast<double>(count);
  double scatter = 0.0;
  for (const auto& z : turned) scatter += std::norm(z - average);
  const double scatter_dof = 2.0 * (count - 1);
  double variance = scatter / scatter_dof;
  double dof = scatter_dof;

  const Noise noise = noise_around(bin, first);
  if (noise.dof > 0.0 && noise.sigma > 0.0) {
    const double noise_variance = noise.sigma * noise.sigma;
    const double ratio_limit =
        boost::math::quantile(boost::math::fisher_f(scatter_dof, noise.dof), 0.999);
    if (variance <= ratio_limit * noise_variance) {
      variance = (scatter_dof * variance + noise.dof * noise_variance) / (scatter_dof + noise.dof);
      dof = scatter_dof + noise.dof;
    }
  }
  return {average, std::sqrt(variance / count), dof};
}

double BlockSpectra::band_power(int block, std::size_t low, std::size_t high) const {
  double sum = 0.0;
  for (std::size_t k = low; k <= high && k < bins(); ++k) sum += 0.5 * std::norm(at(block, k));
  return sum;
}

double noise_threshold(double u) { return kRayleigh95 * u; }

double amplitude_upper_limit(double read, double u) {
  if (u <= 0.0) return read;
  // Far above the noise a Rice variate is normal to u^2 / read.
  constexpr double kNormal = 1e3, kOneSided95 = 1.6448536269514722;
  if (read > kNormal * u) return read + kOneSided95 * u;
  const double normalised = (read / u) * (read / u);
  const double least = noise_threshold(u);
  // With amplitude nu, (read/u)^2 is non-central chi-square with 2 dof and non-centrality (nu/u)^2.
  // Below the 5 % point of noise alone no amplitude satisfies the condition; `least` stands then.
  if (normalised <= -2.0 * std::log(0.95)) return least;
  const double centrality =
      boost::math::non_central_chi_squared::find_non_centrality(2.0, normalised, 0.05);
  return std::max(least, u * std::sqrt(centrality));
}

}  // namespace kneeprint
