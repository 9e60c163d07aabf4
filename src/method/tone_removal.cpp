// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/tone_removal.h"

#include <array>
#include <cmath>
#include <complex>
#include <numbers>
#include <vector>

namespace kneeprint {
namespace {

constexpr std::size_t kTerms = 4;
// Whole cycles make all the products of different orders vanish but those with the slope of an
// envelope: each pass leaves some 1e-4 of what it found.
constexpr int kPasses = 2;

std::array<double, kTerms> legendre(double u) {
  return {1.0, u, 0.5 * (3.0 * u * u - 1.0), 0.5 * u * (5.0 * u * u - 3.0)};
}

// exp(j 2 pi k / block), exact at every sample since whole cycles fill a block.
std::vector<std::complex<double>> turns(std::size_t block) {
  std::vector<std::complex<double>> table(block);
  for (std::size_t k = 0; k < block; ++k) {
    table[k] = std::polar(
        1.0, 2.0 * std::numbers::pi * static_cast<double>(k) / static_cast<double>(block));
  }
  return table;
}

}  // namespace

void remove_tones(std::span<double> x, const CoherentTone& tone, int orders) {
  const auto table = turns(tone.block);
  const auto size = static_cast<double>(x.size());
  const auto at = [&](std::size_t n) { return (2.0 * static_cast<double>(n) + 1.0) / size - 1.0; };
  for (int pass = 0; pass < kPasses; ++pass) {
    for (int order = 1; order <= orders; ++order) {
      const std::size_t step = tone.cycles * static_cast<std::size_t>(order);
      if (2 * step >= tone.block) break;
      std::array<std::complex<double>, kTerms> envelope{};
      for (std::size_t n = 0, k = 0; n < x.size(); ++n, k = (k + step) % tone.block) {
        const auto p = legendre(at(n));
        const std::complex<double> turned = x[n] * std::conj(table[k]);
        for (std::size_t i = 0; i < kTerms; ++i) envelope[i] += p[i] * turned;
      }
      // Norm of P_i over [-1, 1]: 2 / (2 i + 1); 2 for the half of a real tone at -f.
      for (std::size_t i = 0; i < kTerms; ++i) {
        envelope[i] *= 2.0 * (2.0 * static_cast<double>(i) + 1.0) / size;
      }
      for (std::size_t n = 0, k = 0; n < x.size(); ++n, k = (k + step) % tone.block) {
        const auto p = legendre(at(n));
        std::complex<double> sum = 0.0;
        for (std::size_t i = 0; i < kTerms; ++i) sum += envelope[i] * p[i];
        x[n] -= sum.real() * table[k].real() - sum.imag() * table[k].imag();
      }
    }
  }
}

}  // namespace kneeprint
