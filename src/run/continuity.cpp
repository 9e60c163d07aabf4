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

// In chunks over the hold: rms of x[n + block] - x[n], and of x[n] itself.
struct Chunks {
  std::vector<double> difference, level;
};

Chunks chunks_of(const Waveform& take, const HoldLayout& hold) {
  const std::size_t chunk = std::max<std::size_t>(1, samples_in(kChunk, take.rate));
  Chunks out;
  for (std::size_t n = hold.first_block; n + chunk + hold.block <= hold.end(); n += chunk) {
    double differences = 0.0, squares = 0.0;
    for (std::size_t i = n; i < n + chunk; ++i) {
      const double d = take.samples[i + hold.block] - take.samples[i];
      differences += d * d;
      squares += take.samples[i] * take.samples[i];
    }
    out.difference.push_back(std::sqrt(differences / static_cast<double>(chunk)));
    out.level.push_back(std::sqrt(squares / static_cast<double>(chunk)));
  }
  return out;
}

// Is there an abrupt, lasting change from small to large? One that the take's own level makes as
// well is none: where a sweep ends, so does whatever differs between its repeats.
bool is_edge(double largest_small, double smallest_large, double level_small, double level_large) {
  const double own = level_large > level_small ? level_large / level_small : 1.0;
  return smallest_large > kSmallest &&
         smallest_large > kEdge * std::max(largest_small * own, kSmallest / kEdge);
}

}  // namespace

Continuity check_continuity(const Waveform& take, const HoldLayout& hold) {
  Continuity result;
  if (hold.blocks < 2) return result;
  const auto [d, level] = chunks_of(take, hold);
  const auto size = static_cast<int>(d.size());
  for (int i = 1; i < size && !result.jumped; ++i) {
    // The chunk in which the jump stands, i, is mixed; it is left out.
    const auto before_first = d.begin() + std::max(0, i - kSustained), before_last = d.begin() + i;
    const auto after_first = d.begin() + std::min(size, i + 1),
               after_last = d.begin() + std::min(size, i + 1 + kSustained);
    if (after_first == after_last) break;
    const auto [low_b, high_b] = std::minmax_element(before_first, before_last);
    const auto [low_a, high_a] = std::minmax_element(after_first, after_last);
    const double level_b = *std::max_element(level.begin() + (before_first - d.begin()),
                                             level.begin() + (before_last - d.begin()));
    const double level_a = *std::max_element(level.begin() + (after_first - d.begin()),
                                             level.begin() + (after_last - d.begin()));
    if (is_edge(*high_b, *low_a, level_b, level_a) || is_edge(*high_a, *low_b, level_a, level_b)) {
      result.jumped = true;
      result.at_s = static_cast<double>(hold.first_block) / take.rate.value() + i * kChunk.value();
    }
  }
  if (result.jumped) return result;

  const BlockSpectra spectra(take, hold, 1);
  // Another clock moves every line of the spectrum by the same time in every block; settling does
  // not. A sweep has many lines, each near its noise: all that are within 10 dB of the strongest
  // tell the time together (least squares of angle over bin number, weighted by power).
  std::vector<double> power(spectra.bins(), 0.0);
  for (std::size_t k = 1; k < spectra.bins(); ++k) power[k] = std::norm(spectra.at(0, k));
  const double least_power = 0.1 * *std::max_element(power.begin(), power.end());
  std::vector<double> steps;
  for (int b = 1; b < spectra.blocks(); ++b) {
    double turned = 0.0, squares = 0.0;
    for (std::size_t k = 1; k < spectra.bins(); ++k) {
      if (power[k] < least_power) continue;
      const auto bin = static_cast<double>(k);
      turned += power[k] * bin * std::arg(spectra.at(b, k) / spectra.at(b - 1, k));
      squares += power[k] * bin * bin;
    }
    steps.push_back(turned / squares);
  }
  const auto [least, most] = std::minmax_element(steps.begin(), steps.end());
  const double mean = (*least + *most) / 2.0;
  if (*most - *least < 0.3 * std::abs(mean)) {
    result.clock_ppm = 1e6 * mean / (2.0 * std::numbers::pi);
  }
  return result;
}

}  // namespace kneeprint
