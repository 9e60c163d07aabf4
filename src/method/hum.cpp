// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/hum.h"

#include <algorithm>
#include <array>
#include <boost/math/distributions/fisher_f.hpp>
#include <cmath>
#include <map>

#include "method/noise_power.h"

namespace kneeprint {
namespace {

constexpr std::array kBases{50, 60};
constexpr double kSearch = 0.01;                // of the base, up and down
constexpr double kStep = 0.0125;                // Hz: half a bin at 2 kHz
constexpr double kHighest = 2000.0;             // Hz
constexpr double kWander = 0.05;                // Hz, of the mains, within a recording
constexpr double kClearOfTone = 5.0;            // Hz
constexpr int kLowMultiple = 12;                // one of these must be there
constexpr double kFamily = 0.05;                // chance of any false line
constexpr std::size_t kMainLobe = 2;            // bins on either side hold 99.9 % of a Hann line
constexpr std::size_t kNoiseBins = 20;          // on either side of the line's band
constexpr double kStrong = 20.0;                // over the noise: good for the frequency
constexpr double kAmplitudeShared = 1.0 / 6.0;  // of neighbouring segments (Welch 1967)

// Part of the independent values that `bins` neighbouring bins of a Hann window are worth: power
// correlations (2/3)^2 and (1/6)^2.
double worth(double bins) {
  return 1.0 / (1.0 + 2.0 * ((1.0 - 1.0 / bins) * 4.0 / 9.0 + (1.0 - 2.0 / bins) / 36.0));
}

// One multiple, read at one mains frequency.
struct BandReading {
  std::size_t low = 0, high = 0;  // bins
  double power = 0.0;             // above the noise
  double noise = 0.0;             // density
  double ratio = 0.0;             // density over the noise's
  double dof = 0.0, noise_dof = 0.0;
  double bins() const { return static_cast<double>(high - low + 1); }
};

class HumSearch {
 public:
  HumSearch(const NoiseSpectrum& noise, std::optional<Hertz> tone) : noise_(noise), tone_(tone) {
    for (const int base : kBases) {
      tests_ += static_cast<double>(grid(base).size() * multiples(base).size());
    }
  }
  Hum find();

 private:
  std::vector<int> multiples(double mains) const;
  static std::vector<double> grid(int base);
  BandReading band(double f) const;
  bool found(const BandReading& b) const;
  double score(double mains) const;
  std::vector<int> found_at(double mains) const;
  std::optional<Uncertain> refined(double mains, const std::vector<int>& lines) const;
  double gaussian_u(const BandReading& b) const;
  HumLine line(double mains, int multiple) const;
  double limit() const;

  const NoiseSpectrum& noise_;
  std::optional<Hertz> tone_;
  double tests_ = 0.0;
  mutable std::map<double, double> thresholds_;  // by the band's degrees of freedom
};

std::vector<int> HumSearch::multiples(double mains) const {
  const double highest =
      std::min(kHighest, 0.9 * noise_.bin_hz() * static_cast<double>(noise_.bins()));
  std::vector<int> some;
  for (int n = 1; n * mains <= highest; ++n) {
    if (!tone_ || std::abs(n * mains - tone_->value()) >= kClearOfTone) some.push_back(n);
  }
  return some;
}

std::vector<double> HumSearch::grid(int base) {
  std::vector<double> f;
  const int steps = static_cast<int>(std::ceil(kSearch * base / kStep));
  for (int k = -steps; k <= steps; ++k) f.push_back(base + k * kStep);
  return f;
}

BandReading HumSearch::band(double f) const {
  const double width = noise_.bin_hz();
  const auto centre = static_cast<std::size_t>(std::lround(f / width));
  const std::size_t half =
      kMainLobe + static_cast<std::size_t>(std::ceil(kWander * f / kBases[0] / width));
  BandReading b;
  b.low = centre - half;
  b.high = centre + half;
  const auto beside = noise_.around(centre, half + 2, half + 1 + kNoiseBins);
  b.noise = beside.density;
  b.noise_dof = beside.dof;
  b.dof = 2.0 * noise_.effective_segments() * b.bins() * worth(b.bins());
  double sum = 0.0;
  for (std::size_t k = b.low; k <= b.high; ++k) sum += noise_.density(k);
  b.power = (sum - b.bins() * b.noise) * width;
  if (b.noise > 0.0) b.ratio = sum / b.bins() / b.noise;
  return b;
}

bool HumSearch::found(const BandReading& b) const {
  auto [it, is_new] = thresholds_.try_emplace(b.dof, 0.0);
  if (is_new) {
    it->second = boost::math::quantile(
        boost::math::complement(boost::math::fisher_f(b.dof, b.noise_dof), kFamily / tests_));
  }
  return b.ratio > it->second;
}

// Log likelihood gained by a band whose power is `ratio` times the noise's, summed over multiples.
double HumSearch::score(double mains) const {
  double sum = 0.0;
  for (const int n : multiples(mains)) {
    const BandReading b = band(n * mains);
    if (b.ratio > 1.0) sum += 0.5 * b.dof * (b.ratio - 1.0 - std::log(b.ratio));
  }
  return sum;
}

std::vector<int> HumSearch::found_at(double mains) const {
  std::vector<int> lines;
  for (const int n : multiples(mains)) {
    if (found(band(n * mains))) lines.push_back(n);
  }
  if (lines.empty() || lines.front() > kLowMultiple) lines.clear();
  return lines;
}

// Offset of a line from bin k by three bins of a Hann window: with H(d) ~ sin(pi d) / (d (1 - d^2))
// (Harris 1978) X(k+1) (2 - d) + X(k) (1 + d) = 0 and X(k-1) (2 + d) + X(k) (1 - d) = 0; their
// difference is linear in d.
std::optional<Uncertain> HumSearch::refined(double mains, const std::vector<int>& lines) const {
  const int segments = noise_.segments();
  std::vector<double> by_segment(static_cast<std::size_t>(segments), 0.0);
  double weights = 0.0;
  for (const int n : lines) {
    const BandReading b = band(n * mains);
    std::size_t k = b.low;
    for (std::size_t i = b.low; i <= b.high; ++i) {
      if (noise_.density(i) > noise_.density(k)) k = i;
    }
    const double strength = noise_.density(k) / b.noise;
    if (!(strength >= kStrong)) continue;
    std::vector<double> products;
    double norm = 0.0;
    for (int m = 0; m < segments; ++m) {
      const auto below = noise_.at(m, k - 1), middle = noise_.at(m, k), above = noise_.at(m, k + 1);
      const auto denominator = above + below - 2.0 * middle;
      products.push_back((2.0 * (above - below) * std::conj(denominator)).real());
      norm += std::norm(denominator) / segments;
    }
    const double weight = n * n * strength;  // a line's frequency is n times as telling
    for (std::size_t m = 0; m < products.size(); ++m) {
      const double f = (static_cast<double>(k) + products[m] / norm) * noise_.bin_hz();
      by_segment[m] += weight * f / n;
    }
    weights += weight;
  }
  if (weights <= 0.0) return std::nullopt;
  for (double& f : by_segment) f /= weights;
  return mean_by_scatter(by_segment, kAmplitudeShared);
}

// Of the power above the noise: the noise in the band and beside it, and what it adds to the line's
// own amplitude, 2 P G / T for a whole take, here by the windows' noise bandwidth of 1.5 bins.
double HumSearch::gaussian_u(const BandReading& b) const {
  const double width = noise_.bin_hz();
  const double in_band = b.noise * b.bins() * width;
  const double crossed = 2.0 * std::max(0.0, b.power) * b.noise * 1.5 * width *
                         (1.0 + 2.0 * kAmplitudeShared) / noise_.segments();
  return std::sqrt(in_band * in_band * (2.0 / b.dof + 2.0 / b.noise_dof) + crossed);
}

HumLine HumSearch::line(double mains, int multiple) const {
  const BandReading b = band(multiple * mains);
  std::vector<double> parts;
  for (int m = 0; m < noise_.segments(); ++m) {
    double sum = 0.0;
    for (std::size_t k = b.low; k <= b.high; ++k) sum += noise_.density(m, k) - b.noise;
    parts.push_back(sum * noise_.bin_hz());
  }
  return {multiple, multiple * mains, mean_power(parts, gaussian_u(b), kAmplitudeShared)};
}

double HumSearch::limit() const {
  constexpr double kOneSided95 = 1.6448536;
  double most = 0.0;
  for (const int base : kBases) {
    for (const double mains : grid(base)) {
      double power = 0.0, variance = 0.0;
      for (const int n : multiples(mains)) {
        const BandReading b = band(n * mains);
        const double u = gaussian_u(b);
        power += b.power;
        variance += u * u;
      }
      most = std::max(most, std::max(0.0, power) + kOneSided95 * std::sqrt(variance));
    }
  }
  return most;
}

Hum HumSearch::find() {
  Hum hum;
  double best = 0.0, mains = 0.0;
  for (const int base : kBases) {
    for (const double f : grid(base)) {
      const double here = score(f);
      if (here <= best || found_at(f).empty()) continue;
      best = here;
      mains = f;
      hum.base_hz = base;
    }
  }
  if (hum.base_hz == 0) {
    hum.limit = limit();
    return hum;
  }
  std::vector<int> lines = found_at(mains);
  // Without a strong line: the highest one found tells the frequency to its band's half width.
  const double half = (kMainLobe * noise_.bin_hz() / lines.back() + kWander) / std::sqrt(3.0);
  hum.frequency = refined(mains, lines).value_or(Uncertain{mains, half, kInfiniteDof});
  mains = hum.frequency.value;
  // The frequency stands now; a line at the rim of its band may have come in or gone.
  if (const std::vector<int> again = found_at(mains); !again.empty()) lines = again;
  std::vector<Contribution> parts;
  for (const int n : lines) {
    hum.lines.push_back(line(mains, n));
    const Uncertain& p = hum.lines.back().power;
    hum.total.value += p.value;
    parts.push_back({p.u, p.dof});
  }
  const Contribution all = combine(parts);
  hum.total.u = all.u;
  hum.total.dof = all.dof;
  return hum;
}

}  // namespace

Hum find_hum(const NoiseSpectrum& noise, std::optional<Hertz> tone) {
  return HumSearch(noise, tone).find();
}

}  // namespace kneeprint
