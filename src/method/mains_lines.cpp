// SPDX-License-Identifier: GPL-3.0-or-later
#include "method/mains_lines.h"

#include <algorithm>
#include <array>
#include <cmath>
#include <numbers>

namespace kneeprint {
namespace {

constexpr double kRounding = 1e-9;  // leaks 180 dB under the line
constexpr int kRounds = 3;          // each leaves some per cent of the error before

// A rectangular window of N samples shows of a cosine of amplitude 1, x bins away,
// sin(pi x) exp(j pi x) (cot(pi x / N) - j) / N (Harris 1978, eq. 21, rearranged), for x << N
// sin(pi x) exp(j pi x) / pi times (1 / x - j pi / N). Whole bins more leave the first factor
// alone.
std::complex<double> numerator(double x) {
  const double turn = std::numbers::pi * x;
  return std::polar(std::sin(turn) / std::numbers::pi, turn);
}

double power_of_multiples(const BlockSpectra& spectra, std::size_t mains) {
  double sum = 0.0;
  for (std::size_t k = mains; k <= MainsLines::kHighest; k += mains) {
    if (k % 300 != 0) sum += spectra.band_power(0, k, k);  // 300 Hz and so on belong to both
  }
  return sum;
}

}  // namespace

// The stronger family first: at the other one's places stands little but what this one leaks.
MainsLines::MainsLines(const BlockSpectra& spectra)
    : tail_(0.0, std::numbers::pi / (2.0 * static_cast<double>(spectra.bins() - 1))) {
  std::array<std::size_t, 2> families{50, 60};
  if (power_of_multiples(spectra, 60) > power_of_multiples(spectra, 50)) {
    std::swap(families[0], families[1]);
  }
  for (const std::size_t mains : families) {
    for (int round = 0; round < kRounds; ++round) {
      follow(spectra, mains);
      refine(spectra);
    }
  }
}

// All multiples of one mains are off in proportion: the slope of their advance over the order by
// least squares, from the lowest up, each unwrapped by those before.
double MainsLines::advance_per_order(const BlockSpectra& spectra, std::size_t mains) const {
  double slope = 0.0, products = 0.0, squares = 0.0;
  for (std::size_t n = 1; n * mains <= kHighest; ++n) {
    std::complex<double> advance = 0.0;
    for (int b = 1; b < spectra.blocks(); ++b) {
      advance += own(spectra, b, n * mains) * std::conj(own(spectra, b - 1, n * mains));
    }
    const auto order = static_cast<double>(n);
    const double predicted = slope * order;
    const double turned =
        predicted + std::remainder(std::arg(advance) - predicted, 2.0 * std::numbers::pi);
    products += std::abs(advance) * order * turned;
    squares += std::abs(advance) * order * order;
    if (squares > 0.0) slope = products / squares;
  }
  return slope;
}

// Places the lines of one mains anew. What both share (300 Hz and so on) stays the first one's.
void MainsLines::follow(const BlockSpectra& spectra, std::size_t mains) {
  const double slope = advance_per_order(spectra, mains);
  std::erase_if(lines_, [&](const Line& line) { return line.mains == mains; });
  for (std::size_t n = 1; n * mains <= kHighest; ++n) {
    double off = static_cast<double>(n) * slope / (2.0 * std::numbers::pi);
    if (std::abs(off) > 0.5) break;
    if (std::abs(off) < kRounding) off = 0.0;
    const bool taken =
        std::ranges::any_of(lines_, [&](const Line& line) { return line.bin == n * mains; });
    if (taken) continue;
    lines_.push_back({mains, n * mains, off, numerator(off), {}});
    lines_.back().amplitude.resize(static_cast<std::size_t>(spectra.blocks()));
  }
}

// Amplitudes by relaxation.
void MainsLines::refine(const BlockSpectra& spectra) {
  for (int round = 0; round < kRounds; ++round) {
    for (Line& line : lines_) {
      for (int b = 0; b < spectra.blocks(); ++b) {
        line.amplitude[static_cast<std::size_t>(b)] = own(spectra, b, line.bin) / line.gain();
      }
    }
  }
}

std::complex<double> MainsLines::own(const BlockSpectra& spectra, int block,
                                     std::size_t bin) const {
  std::complex<double> rest = spectra.at(block, bin) - leakage(block, bin);
  for (const Line& line : lines_) {
    if (line.bin != bin) continue;
    rest += line.amplitude[static_cast<std::size_t>(block)] * line.gain();
  }
  return rest;
}

std::complex<double> MainsLines::leakage(int block, std::size_t bin) const {
  if (bin > kFarthest) return 0.0;
  std::complex<double> sum = 0.0;
  const auto at = static_cast<double>(bin);
  for (const Line& line : lines_) {
    const std::complex<double> a = line.amplitude[static_cast<std::size_t>(block)];
    if (line.off == 0.0) {
      if (line.bin == bin) sum += a;
      continue;
    }
    const auto bin_of_line = static_cast<double>(line.bin);
    const double away = bin_of_line - at + line.off, image = bin_of_line + at + line.off;
    const std::complex<double> n = a * line.numerator;
    // The second term is the cosine's half at negative frequency.
    sum += n * (1.0 / away - tail_) + std::conj(n * (1.0 / image - tail_));
  }
  return sum;
}

}  // namespace kneeprint
