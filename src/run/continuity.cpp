// SPDX-License-Identifier: GPL-3.0-or-later
#include "run/continuity.h"

#include <algorithm>
#include <cmath>
#include <numbers>
#include <vector>

#include "method/block_spectra.h"

namespace kneeprint {
namespace {

constexpr Seconds kChunk{0.005};
constexpr int kSustained = 5;  // chunks on either side of an edge: a click is shorter than that
constexpr double kEdge = 8.0;  // a settling unit changes smoothly, noise by a few per cent
// Of full scale. A settling unit's difference runs into the converters' last bits and stops there
// abruptly; one lost frame of 41 Hz at -60 dBFS still shows 3.8e-6.
constexpr double kSmallest = 2e-6;

// rms of x[n + block] - x[n] in chunks over the hold.
std::vector<double> block_differences(const Waveform& take, const HoldLayout& hold) {
  const std::size_t chunk = std::max<std::size_t>(1, samples_in(kChunk, take.rate));
  std::vector<double> out;
  for (std::size_t n = hold.first_block; n + chunk + hold.block <= hold.end(); n += chunk) {
    double sum = 0.0;
    for (std::size_t i = n; i < n + chunk; ++i) {
      const double d = take.samples[i + hold.block] - take.samples[i];
      sum += d * d;
    }
    out.push_back(std::sqrt(sum / static_cast<double>(chunk)));
  }
  return out;
}

// Is there an abrupt, lasting change from small to large between a[..] (before) and b[..] (after)?
bool is_edge(double largest_small, double smallest_large) {
  return smallest_large > kSmallest &&
         smallest_large > kEdge * std::max(largest_small, kSmallest / kEdge);
}

}  // namespace

Continuity check_continuity(const Waveform& take, const HoldLayout& hold) {
  Continuity result;
  if (hold.blocks < 2) return result;
  const std::vector<double> d = block_differences(take, hold);
  const auto size = static_cast<int>(d.size());
  for (int i = 1; i < size && !result.jumped; ++i) {
    // The chunk in which the jump stands, i, is mixed; it is left out.
    const auto before_first = d.begin() + std::max(0, i - kSustained), before_last = d.begin() + i;
    const auto after_first = d.begin() + std::min(size, i + 1),
               after_last = d.begin() + std::min(size, i + 1 + kSustained);
    if (after_first == after_last) break;
    const auto [low_b, high_b] = std::minmax_element(before_first, before_last);
    const auto [low_a, high_a] = std::minmax_element(after_first, after_last);
    if (is_edge(*high_b, *low_a) || is_edge(*high_a, *low_b)) {
      result.jumped = true;
      result.at_s = static_cast<double>(hold.first_block) / take.rate.value() + i * kChunk.value();
    }
  }
  if (result.jumped) return result;

  const BlockSpectra spectra(take, hold, 1);
  std::size_t strongest = 1;
  for (std::size_t k = 1; k < spectra.bins(); ++k) {
    if (std::abs(spectra.at(0, k)) > std::abs(spectra.at(0, strongest))) strongest = k;
  }
  std::vector<double> steps;
  for (int b = 1; b < spectra.blocks(); ++b) {
    steps.push_back(std::arg(spectra.at(b, strongest) / spectra.at(b - 1, strongest)));
  }
  const auto [least, most] = std::minmax_element(steps.begin(), steps.end());
  const double mean = (*least + *most) / 2.0;
  // Two clocks turn the phase by the same angle in every block; settling does not.
  if (*most - *least < 0.3 * std::abs(mean)) {
    result.clock_ppm = 1e6 * mean / (2.0 * std::numbers::pi * static_cast<double>(strongest));
  }
  return result;
}

}  // namespace kneeprint
