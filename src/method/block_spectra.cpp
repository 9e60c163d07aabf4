// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/block_spectra.h"

#include <algorithm>
#include <array>
#include <boost/math/distributions/chi_squared.hpp>
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
constexpr double kTail = 0.025;  // on either side of a 95 % interval
// Level of the F test. Where blocks scatter two to four times as much in variance it mostly passes:
// then a line's interval covers 87 % and a tone's 83 % with five blocks, with three 77 % (a trial
// with 10^5 repeats; at a level of 0.1 %: 83, 78 and 71 %). At 10 % clean takes would get intervals
// wider by 7 to 30 % on average.
constexpr double kBlocksScatterMore = 0.99;
constexpr double kRayleigh95 = 2.4477468307;  // sqrt(-2 ln 0.05)

// The quantile of F(dof1, dof2) at that level. Lines of a take ask for the same few again and
// again.
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
  place = {dof1, dof2,
           boost::math::quantile(boost::math::fisher_f(dof1, dof2), kBlocksScatterMore)};
  return place.quantile;
}

// Six multiples on either side, counted from where they exceed the noise in 20 % of cases: then hum
// from nothing to 1.5 times the noise leaves 94.7 to 95.7 % in a 95 % interval (a trial with 2 10^5
// repeats, hum falling as 1/f); counted only when certain (0.1 %) it would be 91 % just below that.
constexpr int kMultiples = 6;
constexpr double kLikely = 0.8, kCertain = 0.999;
constexpr long kHighestLikely = 50;  // order of mains up to which hum is likely

// What the mean power of `count` lines of noise stays below with that chance, over its expectation.
double noise_ratio(int count, double chance) {
  using Ratios = std::array<double, 2 * kMultiples + 1>;
  const auto ratios_of = [](double p) {
    Ratios out{};
    for (std::size_t n = 1; n < out.size(); ++n) {
      const double dof = 2.0 * static_cast<double>(n);
      out[n] = quantile(boost::math::chi_squared(dof), p) / dof;
    }
    return out;
  };
  static const Ratios likely = ratios_of(kLikely), certain = ratios_of(kCertain);
  return (chance == kLikely ? likely : certain).at(static_cast<std::size_t>(count));
}

// Up to here (over u) an amplitude's upper limit is the noise threshold: an amplitude as large as
// the threshold reads lower than 0.8 u in 2.1 % of cases, so the one that does in 2.5 % is smaller.
constexpr double kThresholdRules = 0.8;

// The amplitude that reads lower than `x` in 2.5 % of cases, both over u: the root of the
// non-centrality with which a chi-square of 2 dof stays below x^2.
double amplitude_reading_lower(double x) {
  // By how much it exceeds x, over 1 / x down to 0, where it is the normal distribution's 1.96:
  // Boost finds it in milliseconds for strong lines, and not at all above x = 5 * 10^4. 40 points
  // hold it to the last bits (tests/method/block_spectra_test.cpp).
  static const ChebyshevCurve excess(
      [](double inverse) {
        constexpr double kNormal = 1.959963984540054;
        if (inverse == 0.0) return kNormal;
        const double at = 1.0 / inverse;
        return std::sqrt(
                   boost::math::non_central_chi_squared::find_non_centrality(2.0, at * at, kTail)) -
               at;
      },
      0.0, 1.0 / kThresholdRules, 40);
  return x + excess(1.0 / x);
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
  const auto centre = static_cast<long>(bin), stride = static_cast<long>(stride_);
  const long nearest_below = centre - 1 - static_cast<long>(emptied_);
  const long nearest_above = centre + 1 + static_cast<long>(emptied_);
  const long below = nearest_below - nearest_below / stride;
  const long above = top - top / stride - (nearest_above - 1 - (nearest_above - 1) / stride);
  const long each = below > 0 && above > 0 ? std::min<long>({below, above, kNeighboursEachSide})
                                           : kNeighboursEachSide;
  for (long side : {-1, 1}) {
    long taken = 0;
    const long start = side < 0 ? nearest_below : nearest_above;
    long phase = ((start % stride) + stride) % stride;  // of the stride; 0: a line may stand there
    for (long k = start; k >= 1 && k <= top && taken < each; k += side) {
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

double BlockSpectra::hum_at(std::size_t bin, int first, const Noise& noise) const {
  if (!(noise.dof > 0.0)) return 0.0;
  const auto centre = static_cast<long>(bin), stride = static_cast<long>(stride_);
  const int averaged = blocks() - first;
  const double of_noise = 2.0 * noise.sigma * noise.sigma / averaged;
  double most = 0.0;
  for (const double mains : {50.0, 60.0}) {
    const double cycles = mains / bin_width_;
    const long step = std::lround(cycles);
    if (step < 1 || std::abs(cycles - static_cast<double>(step)) > 1e-6 * cycles ||
        centre % step != 0) {
      continue;
    }
    double sum = 0.0;
    int count = 0;
    for (int away = -kMultiples; away <= kMultiples; ++away) {
      const long k = centre + away * step;
      if (k < 1 || k >= static_cast<long>(bins()) - 1 || k % stride == 0) continue;
      // Mains fills whole cycles of a block, so its phase stands still.
      std::complex<double> line = 0.0;
      for (int b = first; b < blocks(); ++b) line += at(b, static_cast<std::size_t>(k));
      sum += std::norm(line / static_cast<double>(averaged));
      ++count;
    }
    if (count == 0) continue;
    const double power = sum / count;
    const double chance = centre / step <= kHighestLikely ? kLikely : kCertain;
    if (power > of_noise * noise_ratio(count, chance)) {
      most = std::max(most, std::sqrt(power - of_noise));
    }
  }
  return most;
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
  return pooled(average, scatter, 2.0 * (count - 1), bin, first);
}

Line BlockSpectra::tone(std::size_t bin, int first) const {
  const int count = blocks() - first;
  double sum = 0.0, scatter = 0.0;
  for (int b = first; b < blocks(); ++b) sum += std::abs(at(b, bin));
  const double average = sum / count;
  for (int b = first; b < blocks(); ++b) {
    const double off = std::abs(at(b, bin)) - average;
    scatter += off * off;
  }
  Line line = pooled(average, scatter, count - 1.0, bin, first);
  if (average > 0.0)
    line.mean -= std::min(0.5 * average, count * line.u * line.u / (2.0 * average));
  return line;
}

Line BlockSpectra::pooled(std::complex<double> mean, double scatter, double scatter_dof,
                          std::size_t bin, int first) const {
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
  const std::array parts{
      Contribution{std::sqrt(variance / (blocks() - first)), dof},
      Contribution{hum_at(bin, first, noise) / std::numbers::sqrt2, kInfiniteDof}};
  const Contribution all = combine(parts);
  return {mean, all.u, parts[1].u > 0.0 ? all.dof : dof};
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

double without_noise(double read, double u) {
  return read > u ? std::sqrt((read - u) * (read + u)) : 0.0;
}

double amplitude_upper_limit(double read, double u) {
  if (u <= 0.0) return read;
  const double least = noise_threshold(u);
  // With amplitude nu, (read/u)^2 is non-central chi-square with 2 dof and non-centrality (nu/u)^2.
  if (read <= kThresholdRules * u) return least;
  return std::max(least, u * amplitude_reading_lower(read / u));
}

}  // namespace kneeprint
