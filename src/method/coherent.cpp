// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/coherent.h"

#include <fmt/format.h>

#include <algorithm>
#include <cmath>
#include <numeric>

#include "quantity/failure.h"
#include "signal/waveform.h"

namespace kneeprint {
namespace {

constexpr double kLargestShift = 0.001 * (1.0 + 1e-9);
constexpr Seconds kGrid{0.1};  // whole cycles of 50 and of 60 Hz
constexpr Seconds kLongestBlock{10.0};

// Mains wanders by some 0.05 Hz, so 1 Hz is far; but 0.1 % of a frequency that stands on a multiple
// itself (100 Hz, 250 Hz) leaves less, and costs a longer block.
struct Clearance {
  double hertz;
  Seconds longest_block;
};
constexpr Clearance kClearances[] = {
    {1.0, Seconds(2.0)}, {0.2, kLongestBlock}, {0.1, kLongestBlock}};

bool clear_of_mains(double f, int orders, double clearance) {
  for (int n = 1; n <= orders; ++n) {
    for (const double mains : {50.0, 60.0}) {
      if (std::abs(std::remainder(n * f, mains)) < clearance * (1.0 - 1e-9)) return false;
    }
  }
  return true;
}

struct Grid {
  std::size_t samples, first, last;  // block = multiple * samples, multiples first .. last
};

// The tone of the shortest block that has one at this clearance; a clearance of 0 takes the
// nearest.
CoherentTone shortest(Hertz asked, Hertz rate, int orders, Grid grid, double clearance) {
  for (std::size_t multiple = grid.first; multiple <= grid.last; ++multiple) {
    const std::size_t block = multiple * grid.samples;
    const double bin = rate.value() / static_cast<double>(block);
    const auto low = static_cast<long>(std::ceil(asked.value() * (1.0 - kLargestShift) / bin));
    const auto high = static_cast<long>(std::floor(asked.value() * (1.0 + kLargestShift) / bin));
    CoherentTone best{};
    double nearest = 0.0;
    for (long k = std::max(1L, low); k <= high; ++k) {
      const double f = static_cast<double>(k) * bin;
      const double off = std::abs(f - asked.value());
      if ((best.cycles != 0 && off >= nearest) || !clear_of_mains(f, orders, clearance)) continue;
      best = {Hertz(f), block, static_cast<std::size_t>(k)};
      nearest = off;
    }
    if (best.cycles != 0) return best;
  }
  return {};
}

}  // namespace

CoherentTone coherent_tone(Hertz asked, Hertz rate, Seconds wanted, int orders) {
  const std::size_t grid = std::max<std::size_t>(1, samples_in(kGrid, rate));
  const std::size_t first = (samples_in(wanted, rate) + grid - 1) / grid;
  const auto up_to = [&](Seconds longest) {
    return Grid{grid, first, std::max(first, samples_in(longest, rate) / grid)};
  };
  for (const Clearance& c : kClearances) {
    const CoherentTone tone = shortest(asked, rate, orders, up_to(c.longest_block), c.hertz);
    if (tone.cycles != 0) return tone;
  }
  const CoherentTone nearest = shortest(asked, rate, orders, up_to(kLongestBlock), 0.0);
  if (nearest.cycles != 0) return nearest;
  // Only below 0.1 Hz, or at a rate under 10 Hz, does no multiple serve: one block of one cycle
  // then.
  const auto block = static_cast<std::size_t>(std::llround(rate.value() / asked.value()));
  return {Hertz(rate.value() / static_cast<double>(block)), block, 1};
}

std::size_t common_block(std::span<const Hertz> tones, Hertz rate, Seconds wanted) {
  const std::size_t grid = std::max<std::size_t>(1, samples_in(kGrid, rate));
  const auto fits = [&](std::size_t block) {
    return std::all_of(tones.begin(), tones.end(), [&](Hertz f) {
      const double c = f.value() * static_cast<double>(block) / rate.value();
      return std::abs(c - std::round(c)) < 1e-9 * c;
    });
  };
  std::size_t block = (samples_in(wanted, rate) + grid - 1) / grid * grid;
  const std::size_t limit = samples_in(kLongestBlock, rate);
  while (!fits(block) && block < limit) block += grid;
  return block;
}

CoherentPair coherent_pair(Hertz f1, Hertz f2, Hertz rate, Seconds wanted) {
  constexpr double kExact = 1e-9;
  constexpr Seconds kWholeHertz{2.0};  // an even number of cycles of every whole frequency
  const std::size_t grid = std::max<std::size_t>(1, samples_in(kGrid, rate));
  const std::size_t first = (samples_in(wanted, rate) + grid - 1) / grid * grid;
  const auto shortest_within = [&](Seconds longer, double shift) -> CoherentPair {
    const std::size_t last = first + samples_in(longer, rate);
    for (std::size_t block = first; block <= last; block += grid) {
      const double bin = rate.value() / static_cast<double>(block);
      const double c1 = std::round(f1.value() / bin), c2 = std::round(f2.value() / bin);
      const auto near = [&](double cycles, Hertz f) {
        return std::abs(cycles * bin - f.value()) <= shift * f.value();
      };
      if (!(c1 >= 1.0 && c2 > c1) || !near(c1, f1) || !near(c2, f2) || !near(c2 - c1, f2 - f1)) {
        continue;
      }
      const auto n1 = static_cast<std::size_t>(c1), n2 = static_cast<std::size_t>(c2);
      if (std::gcd(n1, n2) < 2) continue;
      if (shift <= kExact) return {f1, f2, block, n1, n2};
      return {Hertz(c1 * bin), Hertz(c2 * bin), block, n1, n2};
    }
    return {};
  };
  for (const CoherentPair& pair :
       {shortest_within(kWholeHertz, kExact), shortest_within(kLongestBlock, kLargestShift)}) {
    if (pair.block != 0) return pair;
  }
  throw InputError(fmt::format(
      "tones {} and {} Hz: no block of up to {:g} s holds whole cycles of both at {} Hz; "
      "expected a lower and a higher tone, whole hertz apart",
      f1.value(), f2.value(), (wanted + kLongestBlock).value(), rate.value()));
}

}  // namespace kneeprint
