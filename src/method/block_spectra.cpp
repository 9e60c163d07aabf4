// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/block_spectra.h"

#include <algorithm>
#include <array>
#include <boost/math/distributions/fisher_f.hpp>
#include <boost/math/distributions/non_central_chi_squared.hpp>
#include <cmath>
#include <numbers>
#include <vector>

#include "quantity/chebyshev.h"
#include "signal/median.h"

namespace kneeprint {
namespace {

constexpr int kNeighboursEachSide = 24;
// The median of n exponential variates is 48 % efficient for large n (asymptotic variance of the
// median, Kendall & Stuart vol. 1, from memory), which costs that share of the degrees of freedom.
constexpr double kMedianEfficiency = 0.48;
constexpr double kRayleigh95 = 2.4477468307;  // sqrt(-2 ln 0.05)

// The 99.9 % quantile of F(dof1, dof2). Lines of a take ask for the same few again and again.
double largest_ratio(double dof1, double dof2) {
  struct Asked {
    double dof1 = 0.0, dof2 = 0.0, quantile = 0.0;
  };
  thread_local std::array<Asked, 8> known;
  thread_local std::size_t oldest = 0;
  for (const Asked& k : known) {
    if (k.dof1 == dof1 && k.dof2 == dof2) return k.quantile;
  }
  Asked& place = known[oldest];
  oldest = (oldest + 1) % known.size();
  place = {dof1, dof2, boost::math::quantile(boost::math::fisher_f(dof1, dof2), 0.999)};
  return place.quantile;
}

// Up to here an amplitude's upper limit is the noise threshold: a non-centrality of 5.99 (its
// square) stays below 1 in more than 5 % of cases, so a smaller one satisfies the condition.
constexpr double kThresholdRules = 1.0;

// The non-centrality with which a chi-square of 2 dof stays below `x` in 5 % of cases.
double centrality(double x) {
  const auto exact = [](double at) {
    return boost::math::non_central_chi_squared::find_non_centrality(2.0, at, 0.05);
  };
  // Line after line asks for it up to where the noise threshold ends (5.99): 48 points hold it to
  // the last bits (tests/method/block_spectra_test.cpp).
  static const ChebyshevCurve curve(exact, kThresholdRules, 6.0, 48);
  return x <= curve.high() ? curve(x) : exact(x);
}

}  // namespace

BlockSpectra::BlockSpectra(const Waveform& take, const HoldLayout& hold, std::size_t stride,
                           std::size_t emptied)
    : blocks_(hold.blocks),
      bins_(hold.block / 2 + 1),
      spectra_(spectrum_buffer(static_cast<std::size_t>(hold.blocks) * bins_)),
      scale_(2.0 / static_cast<double>(hold.block)),
      bin_width_(take.rate.value() / static_cast<double>(hold.block)),
      stride_(stride),
      emptied_(emptied) {
  for (int k = 0; k < blocks_; ++k) {
    const std::size_t start = hold.first_block + hold.block * static_cast<std::size_t>(k);
    forward_fft(std::span(take.samples).subspan(start, hold.block),
                spectra_.get() + static_cast<std::size_t>(k) * bins_);
  }
}

BlockSpectra::Noise BlockSpectra::noise_around(std::size_t bin, int first) const {
  const auto counted = static_cast<std::size_t>(std::max(0, blocks_ - first));
  std::vector<double> powers;
  powers.reserve(2 * kNeighboursEachSide * counted);
  const auto top =
      static_cast<long>(bins()) - 2;  // the last bin may be Nyquist: real, half the power
  const auto stride = static_cast<long>(stride_);
  for (long side : {-1, 1}) {
    int taken = 0;
    const long start = static_cast<long>(bin) + side * (1 + static_cast<long>(emptied_));
    long phase = ((start % stride) + stride) % stride;  // of the stride; 0: a line may stand there
    for (long k = start; k >= 1 && k <= top && taken < kNeighboursEachSide; k += side) {
      const bool is_line = phase == 0;
      phase = side > 0 ? (phase + 1 == stride ? 0 : phase + 1) : (phase == 0 ? stride : phase) - 1;
      if (is_line) continue;
      ++taken;
      for (int b = first; b < blocks_; ++b) {
        powers.push_back(std::norm(at(b, static_cast<std::size_t>(k))));
      }
    }
  }
  if (powers.size() < 8) return {};
  const double median = upper_median(powers);
  // |Z|^2 of Gaussian noise is exponential with mean 2 sigma^2 and median 2 sigma^2 ln 2.
  return {std::sqrt(median / (2.0 * std::numbers::ln2)),
          2.0 * kMedianEfficiency * static_cast<double>(powers.size())};
}

Line BlockSpectra::mean(std::size_t bin, int first, const std::function<double(int)>& turn) const {
  const int count = blocks() - first;
  std::vector<std::complex<double>> turned;
  turned.reserve(static_cast<std::size_t>(std::max(0, count)));
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
    if (variance <= largest_ratio(scatter_dof, noise.dof) * noise_variance) {
      variance = (scatter_dof * variance + noise.dof * noise_variance) / (scatter_dof + noise.dof);
      dof = scatter_dof + noise.dof;
    }
  }
  return {average, std::sqrt(variance / count), dof};
}

double BlockSpectra::band_power(int block, std::size_t low, std::size_t high) const {
  const std::size_t end = std::min(high + 1, bins_);
  const std::complex<double>* z = block_start(block);
  // Four sums side by side: one alone waits for each addition, and rounds more.
  double sums[4] = {};
  std::size_t k = low;
  double mean_square = 0.0;
  if (k == 0 && k < end) mean_square = 0.5 * std::norm(at(block, k++));
  for (; k + 4 <= end; k += 4) {
    for (std::size_t i = 0; i < 4; ++i) sums[i] += std::norm(z[k + i]);
  }
  for (; k < end; ++k) sums[0] += std::norm(z[k]);
  return mean_square + 0.5 * scale_ * scale_ * ((sums[0] + sums[1]) + (sums[2] + sums[3]));
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
  if (normalised <= kThresholdRules) return least;
  return std::max(least, u * std::sqrt(centrality(normalised)));
}

}  // namespace kneeprint
