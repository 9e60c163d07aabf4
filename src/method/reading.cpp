// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/reading.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

namespace kneeprint {

Amplitude amplitude_of(double read, double u, double dof) {
  const bool in_noise = read <= noise_threshold(u);
  return {without_noise(read, u), u, dof, in_noise,
          in_noise ? amplitude_upper_limit(read, u) : 0.0};
}

RelativeReading relate(const Amplitude& amplitude, const Line& reference, double floor) {
  const double carrier = std::abs(reference.mean);
  RelativeReading out;
  out.ratio = amplitude.value / carrier;
  out.common_u = out.ratio * reference.u / carrier;
  const std::array parts{Contribution{amplitude.u / carrier, amplitude.dof},
                         Contribution{out.common_u, reference.dof},
                         Contribution{floor / std::numbers::sqrt2, kInfiniteDof}};
  const Contribution combined = combine(parts);
  out.u = combined.u;
  out.dof = combined.dof;
  if (amplitude.in_noise) {
    out.flag = Flag::noise;
    out.ratio = amplitude.limit / carrier;
  } else if (out.ratio <= floor) {
    out.flag = Flag::floor;
  }
  return out;
}

RelativeReading relate(double amplitude, double u, double dof, const Line& reference,
                       double floor) {
  return relate(amplitude_of(amplitude, u, dof), reference, floor);
}

RelativeReading with_common(const RelativeReading& r, double relative_u) {
  RelativeReading out = r;
  const double common = r.ratio * relative_u;
  const std::array parts{Contribution{r.u, r.dof}, Contribution{common, kInfiniteDof}};
  const Contribution combined = combine(parts);
  out.u = combined.u;
  out.dof = combined.dof;
  out.common_u = std::hypot(r.common_u, common);
  return out;
}

bool serves_as_reference(const Line& tone, int blocks) {
  // Noise alone passes 5 sigma in 4 of 10^6.
  return std::abs(tone.mean) > std::max(5.0, 2.5 * std::sqrt(blocks)) * tone.u;
}

RelativeReading root_sum_of(std::span<const RelativeReading> parts) {
  double seen = 0.0, limits = 0.0;
  bool any_seen = false, all_floor = true;
  for (const RelativeReading& r : parts) {
    (r.flag == Flag::noise ? limits : seen) += r.ratio * r.ratio;
    if (r.flag == Flag::noise) continue;
    any_seen = true;
    all_floor &= r.flag == Flag::floor;
  }
  RelativeReading out;
  out.ratio = std::sqrt(any_seen ? seen : limits);
  if (!any_seen) out.flag = Flag::noise;
  if (any_seen && all_floor) out.flag = Flag::floor;
  if (!(out.ratio > 0.0)) return out;
  std::vector<Contribution> terms;
  for (const RelativeReading& r : parts) {
    if (any_seen && r.flag == Flag::noise) continue;
    const double own = std::sqrt(std::max(0.0, r.u * r.u - r.common_u * r.common_u));
    terms.push_back({r.ratio * own / out.ratio, r.dof});
    out.common_u += r.ratio * r.common_u / out.ratio;
  }
  terms.push_back({out.common_u, kInfiniteDof});
  if (any_seen && limits > 0.0) {
    const double most = std::sqrt(seen + limits) - out.ratio;
    terms.push_back({most / (2.0 * std::sqrt(3.0)), kInfiniteDof});
  }
  const Contribution combined = combine(terms);
  out.u = combined.u;
  out.dof = combined.dof;
  return out;
}

bool reaches_full_scale(const Waveform& take, const HoldLayout& hold) {
  constexpr double kEnd = 0.9999;
  // Peaks side by side and no early exit, so that the loop runs on vectors: a clipped take is the
  // exception.
  constexpr std::size_t kLanes = 8;
  std::array<double, kLanes> peaks{};
  std::size_t n = hold.first_block;
  for (; n + kLanes <= hold.end(); n += kLanes) {
    for (std::size_t i = 0; i < kLanes; ++i) {
      const double x = std::abs(take.samples[n + i]);
      peaks[i] = x > peaks[i] ? x : peaks[i];
    }
  }
  for (; n < hold.end(); ++n) peaks[0] = std::max(peaks[0], std::abs(take.samples[n]));
  return *std::max_element(peaks.begin(), peaks.end()) >= kEnd;
}

Settled judge_settling(const BlockSpectra& spectra, std::span<const std::size_t> bins,
                       const TakeSettings& settings, Seconds block) {
  constexpr double kClearOfNoise =
      10.0;  // 20 dB: below, the scatter of a block's level is no longer Gaussian
  std::vector<std::vector<double>> levels;
  std::vector<BlockTrend> trends;
  levels.reserve(bins.size());
  for (const std::size_t bin : bins) {
    const double sigma = spectra.noise_around(bin, 0).sigma;
    std::vector<double> decibels;
    double smallest = INFINITY;
    for (int b = 0; b < spectra.blocks(); ++b) {
      const double amplitude = std::abs(spectra.at(b, bin));
      smallest = std::min(smallest, amplitude);
      decibels.push_back(20.0 * std::log10(amplitude));
    }
    if (!(smallest > kClearOfNoise * sigma) || smallest <= 0.0) continue;
    levels.push_back(std::move(decibels));
    trends.push_back({levels.back(), kDbPerRelative * sigma / smallest});
  }
  return find_settled(trends, spectra.blocks(), kept_blocks(settings, block), block,
                      settings.longest_time_constant, settings.wanted_uncertainty);
}

int kept_blocks(const TakeSettings& settings, Seconds block) {
  constexpr int kLeast = 3;  // fewer leave no scatter to speak of
  const double wanted = settings.block.value() * settings.blocks;
  return std::max(kLeast, static_cast<int>(std::ceil(wanted / block.value() - 1e-9)));
}

Flag gravest(std::span<const Flag> flags) {
  constexpr std::array order{Flag::clipped, Flag::unsteady, Flag::alias, Flag::noise, Flag::floor};
  for (const Flag f : order) {
    if (std::find(flags.begin(), flags.end(), f) != flags.end()) return f;
  }
  return Flag::none;
}

}  // namespace kneeprint
