// SPDX-License-Identifier: GPL-3.0-or-later
// Seeded noise to lay over a take: white, 1/f, and hum whose frequency wanders.
#pragma once

#include <cmath>
#include <complex>
#include <numbers>
#include <random>
#include <string_view>
#include <vector>

#include "signal/fft.h"
#include "signal/waveform.h"

namespace kneeprint::testing {

using Random = std::mt19937_64;

enum class NoiseKind { white, pink, mains };

inline std::string_view name(NoiseKind kind) {
  return kind == NoiseKind::white ? "white" : kind == NoiseKind::pink ? "1/f" : "mains";
}

inline double gaussian(Random& random) { return std::normal_distribution<double>()(random); }
inline double any_phase(Random& random) {
  return std::uniform_real_distribution<double>(-std::numbers::pi, std::numbers::pi)(random);
}

inline void add_white(Waveform& w, double sigma, Random& random) {
  std::normal_distribution<double> normal(0.0, sigma);
  for (double& x : w.samples) x += normal(random);
}

/// Power density falling as 1/f, at `same` that of white noise of `sigma`.
inline void add_pink(Waveform& w, double sigma, Hertz same, Random& random) {
  const std::size_t size = fast_length(w.samples.size());
  std::vector<std::complex<double>> spectrum(size / 2 + 1);
  std::normal_distribution<double> normal(0.0, sigma * std::sqrt(static_cast<double>(size) / 2.0));
  for (std::size_t k = 1; k < spectrum.size(); ++k) {
    const double f = static_cast<double>(k) * w.rate.value() / static_cast<double>(size);
    const double re = normal(random), im = normal(random);
    spectrum[k] = std::complex<double>(re, im) * std::sqrt(same.value() / f);
  }
  const std::vector<double> noise = inverse_fft(spectrum, size);
  for (std::size_t n = 0; n < w.samples.size(); ++n) w.samples[n] += noise[n];
}

/// Thirty lines at multiples of 50 Hz, the n-th of peak `strongest` / n with a phase of its own.
/// The frequency swings by 0.05 Hz about 50 Hz in 10 s, from anywhere in that swing.
inline void add_hum(Waveform& w, double strongest, Random& random) {
  constexpr double kSwing = 0.05, kPeriod = 10.0;
  constexpr int kLines = 30;
  const double start = any_phase(random);
  std::vector<std::complex<double>> lines;
  for (int n = 1; n <= kLines; ++n) lines.push_back(std::polar(strongest / n, any_phase(random)));
  for (std::size_t i = 0; i < w.samples.size(); ++i) {
    const double t = static_cast<double>(i) / w.rate.value();
    const double phase = 2.0 * std::numbers::pi * 50.0 * t -
                         kSwing * kPeriod * std::cos(2.0 * std::numbers::pi * t / kPeriod + start);
    const std::complex<double> step = std::polar(1.0, phase);
    std::complex<double> z = 1.0;
    for (const auto& line : lines) {
      z *= step;
      w.samples[i] += line.real() * z.real() - line.imag() * z.imag();
    }
  }
}

/// `sigma` of the white noise, or of white noise as dense as the 1/f noise at `same`.
inline void add_noise(Waveform& w, NoiseKind kind, double sigma, Hertz same, double hum,
                      Random& random) {
  if (kind == NoiseKind::pink) {
    add_pink(w, sigma, same, random);
  } else {
    add_white(w, sigma, random);
  }
  if (kind == NoiseKind::mains) add_hum(w, hum, random);
}

}  // namespace kneeprint::testing
