// SPDX-License-Identifier: GPL-3.0-or-later
#include "signal/delay.h"

#include <algorithm>
#include <cmath>
#include <complex>
#include <numbers>
#include <stdexcept>

#include "signal/fft.h"

namespace kneeprint {
namespace {

using Spectrum = std::vector<std::complex<double>>;

// The correlation's spectrum, zero-padded in time so that no lag wraps round onto another.
struct Correlation {
  std::size_t size;
  Spectrum spectrum;
};

Correlation correlate(std::span<const double> known, std::span<const double> recording,
                      long earliest, long latest) {
  if (known.empty() || recording.empty()) throw std::invalid_argument("nothing to correlate");
  if (earliest > latest) throw std::invalid_argument("no delay to search");
  const std::size_t size = fast_length(known.size() + recording.size());
  const auto padded = [&](std::span<const double> x) {
    std::vector<double> y(size, 0.0);
    std::ranges::copy(x, y.begin());
    return forward_fft(y);
  };
  const Spectrum a = padded(known);
  Spectrum product = padded(recording);
  for (std::size_t k = 0; k < product.size(); ++k) product[k] *= std::conj(a[k]);
  return {size, std::move(product)};
}

std::vector<double> lags(const Correlation& c, std::span<const double> known,
                         std::span<const double> recording, long earliest, long latest) {
  const std::vector<double> circular = inverse_fft(c.spectrum, c.size);
  std::vector<double> out(static_cast<std::size_t>(latest - earliest) + 1, 0.0);
  const long first = std::max(earliest, 1 - static_cast<long>(known.size()));
  const long last = std::min(latest, static_cast<long>(recording.size()) - 1);
  for (long m = first; m <= last; ++m) {
    out[static_cast<std::size_t>(m - earliest)] =
        circular[static_cast<std::size_t>(m < 0 ? m + static_cast<long>(c.size) : m)];
  }
  return out;
}

// Value, slope and curvature of the correlation `off` samples from the lag to which `spectrum` was
// turned.
struct Local {
  double value = 0.0, slope = 0.0, curvature = 0.0;
};

Local evaluate(const Spectrum& spectrum, std::size_t size, double off) {
  const double bin = 2.0 * std::numbers::pi / static_cast<double>(size);
  const std::complex<double> step = std::polar(1.0, bin * off);
  std::complex<double> turn = 1.0;
  Local sum;
  for (std::size_t k = 0; k < spectrum.size(); ++k) {
    const double w = bin * static_cast<double>(k);
    // The running product loses digits slowly; a fresh start every 1024 steps keeps them.
    if (k % 1024 == 0) turn = std::polar(1.0, w * off);
    const std::complex<double> x = spectrum[k] * turn;
    const double both = k == 0 || 2 * k == size ? 1.0 : 2.0;  // with the negative frequency
    sum.value += both * x.real();
    sum.slope -= both * w * x.imag();
    sum.curvature -= both * w * w * x.real();
    turn *= step;
  }
  const auto n = static_cast<double>(size);
  return {sum.value / n, sum.slope / n, sum.curvature / n};
}

}  // namespace

std::vector<double> cross_correlation(std::span<const double> known,
                                      std::span<const double> recording, long earliest,
                                      long latest) {
  return lags(correlate(known, recording, earliest, latest), known, recording, earliest, latest);
}

Delay find_delay(std::span<const double> known, std::span<const double> recording, long earliest,
                 long latest) {
  Correlation c = correlate(known, recording, earliest, latest);
  const std::vector<double> r = lags(c, known, recording, earliest, latest);
  const auto highest =
      std::ranges::max_element(r, [](double a, double b) { return std::abs(a) < std::abs(b); });
  const long best = earliest + (highest - r.begin());

  // Turned to the best whole lag, exactly, the rest is a search within one sample of 0.
  const auto turns_per_bin =
      static_cast<std::size_t>(best < 0 ? best + static_cast<long>(c.size) : best) % c.size;
  for (std::size_t k = 0; k < c.spectrum.size(); ++k) {
    const double turns =
        static_cast<double>(k * turns_per_bin % c.size) / static_cast<double>(c.size);
    c.spectrum[k] *= std::polar(1.0, 2.0 * std::numbers::pi * turns);
  }
  // Newton's method for a slope of zero, kept within an interval in which the magnitude rises at
  // the lower end and falls at the upper.
  constexpr int kMostSteps = 60;
  constexpr double kSmallEnough = 1e-9;
  double low = -1.0, high = 1.0, off = 0.0;
  Local peak = evaluate(c.spectrum, c.size, off);
  const double sign = peak.value < 0.0 ? -1.0 : 1.0;
  for (int i = 0; i < kMostSteps && peak.slope != 0.0; ++i) {
    (sign * peak.slope > 0.0 ? low : high) = off;
    double next = off - peak.slope / peak.curvature;
    if (!(sign * peak.curvature < 0.0 && next > low && next < high)) next = 0.5 * (low + high);
    const double moved = std::abs(next - off);
    off = next;
    peak = evaluate(c.spectrum, c.size, off);
    if (moved < kSmallEnough) break;
  }

  double known_energy = 0.0, heard_energy = 0.0;
  for (const double x : known) known_energy += x * x;
  const long first = std::max(0L, best);
  const long end =
      std::min(static_cast<long>(recording.size()), best + static_cast<long>(known.size()));
  for (long n = first; n < end; ++n) {
    const double x = recording[static_cast<std::size_t>(n)];
    heard_energy += x * x;
  }
  Delay d;
  d.samples = static_cast<double>(best) + off;
  if (known_energy > 0.0) d.gain = peak.value / known_energy;
  const double norm = std::sqrt(known_energy * heard_energy);
  if (norm > 0.0) d.match = std::min(1.0, std::abs(peak.value) / norm);
  return d;
}

}  // namespace kneeprint
