// SPDX-License-Identifier: GPL-3.0-or-later
#include "rig/plan_code.h"

#include <array>
#include <cmath>
#include <complex>
#include <numbers>
#include <stdexcept>

#include "rig/raised_edge.h"
#include "signal/waveform.h"

namespace kneeprint {
namespace {

constexpr std::size_t kDigits = 8;
constexpr Seconds kBurst{0.04}, kEdge{0.005};
// The next loudest tone of a clean burst stands 25 dB below; reverberation brings it closer.
constexpr double kStandsOut = 1.5;

// 100 Hz apart, four times the resolution of a burst; all below the lowest one's second harmonic.
constexpr Hertz frequency_of(std::uint32_t digit) { return Hertz(1600.0 + 100.0 * digit); }

double phase(Hertz f, std::size_t n, Hertz rate) {
  return 2.0 * std::numbers::pi * (f / rate) * static_cast<double>(n);
}

std::optional<std::uint32_t> read_digit(std::span<const double> burst, Hertz rate) {
  std::uint32_t loudest = 0;
  double first = 0.0, second = 0.0;
  for (std::uint32_t digit = 0; digit < 16; ++digit) {
    std::complex<double> sum = 0.0;
    for (std::size_t n = 0; n < burst.size(); ++n) {
      sum += burst[n] * std::polar(1.0, -phase(frequency_of(digit), n, rate));
    }
    const double level = std::abs(sum);
    if (level > first) {
      second = first;
      first = level;
      loudest = digit;
    } else {
      second = std::max(second, level);
    }
  }
  if (!(first > kStandsOut * second)) return std::nullopt;
  return loudest;
}

}  // namespace

std::size_t plan_code_length(Hertz rate) { return kDigits * samples_in(kBurst, rate); }

std::vector<double> plan_code_sound(std::uint32_t code, Hertz rate) {
  const std::size_t burst = samples_in(kBurst, rate);
  std::vector<double> out;
  out.reserve(plan_code_length(rate));
  for (std::size_t place = 0; place < kDigits; ++place) {
    const Hertz f = frequency_of(code >> (4 * place) & 0xF);
    for (std::size_t n = 0; n < burst; ++n) {
      out.push_back(raised_edge(static_cast<double>(n) * period(rate), kBurst, kEdge) *
                    std::sin(phase(f, n, rate)));
    }
  }
  return out;
}

std::optional<std::uint32_t> read_plan_code(std::span<const double> heard, Hertz rate) {
  if (heard.size() < plan_code_length(rate)) throw std::invalid_argument("shorter than a code");
  const std::size_t burst = samples_in(kBurst, rate);
  std::uint32_t code = 0;
  for (std::size_t place = 0; place < kDigits; ++place) {
    const auto digit = read_digit(heard.subspan(place * burst, burst), rate);
    if (!digit) return std::nullopt;
    code |= *digit << (4 * place);
  }
  return code;
}

}  // namespace kneeprint
